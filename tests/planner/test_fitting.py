"""What the fit rules look at is gathered from the fleet."""

from __future__ import annotations

import pytest
import small_tables

from planner.assemble import assemble
from planner.fitting import Fitting
from planner.tables import read_sheets
from sim.errors import RequestError


def fitting(tables: small_tables.Tables) -> Fitting:
    return Fitting(assemble(read_sheets(small_tables.sheets(tables))[0]))


def test_a_module_of_the_spare_engine_fits_elsewhere() -> None:
    assert fitting(small_tables.small_tables()).refusals("HPT-05", "E1") == ()


def test_every_table_is_heard() -> None:
    tables = small_tables.small_tables()
    module = next(row for row in tables["modules"] if row["module_serial"] == "HPT-05")
    module |= {"standard": "pre", "owner": "Lessor"}
    part = next(row for row in tables["parts"] if row["module_serial"] == "HPT-05")
    part["status_substantiated"] = "no"
    tables["leases"] = [
        {"lease": "L", "tail": "T-1", "owner": "A", "return_date": "2028-01-01", "terms": "A", "exchange_rule": "never"}
    ]
    tests = [refusal.test for refusal in fitting(tables).refusals("HPT-05", "E1")]
    assert tests == ["standard", "papers", "papers"]
    # off a tail the lease of the tail is no matter, the proof of life is
    assert [r.test for r in fitting(tables).refusals("HPT-05", "E1", tail="")] == ["standard", "papers"]


def test_a_directive_that_has_come_counts_on_its_day() -> None:
    tables = small_tables.small_tables()
    tables["part_limits"] = [
        row | {"valid_from": "", "serial_prefix": "", "serial_from": "", "serial_to": "", "directive": ""}
        for row in tables["part_limits"]
    ]
    cut = {"part_number": "HPT-D1", "rating": "high", "limit_cycles": "8000", "valid_from": "2026-11-15"}
    cut |= {"serial_prefix": "H", "serial_from": "104", "serial_to": "106", "directive": "D-1", "source": "D-1"}
    tables["part_limits"].append(cut)
    rules = fitting(tables)
    assert rules.refusals("HPT-05", "E1", day=136.0) == ()
    assert [refusal.test for refusal in rules.refusals("HPT-05", "E1", day=137.0)] == ["rating"]
    assert rules.refusals("HPT-03", "E1", day=137.0) == ()


@pytest.mark.parametrize(
    ("module", "engine", "tail"), [("X", "E1", None), ("HPT-05", "X", None), ("HPT-05", "E1", "X")]
)
def test_unknown_serials_are_requests_that_cannot_be(module: str, engine: str, tail: str | None) -> None:
    with pytest.raises(RequestError, match="of the fleet"):
        fitting(small_tables.small_tables()).refusals(module, engine, tail=tail)
