"""Each of the six tests refuses for its own reason, and what passes them all may go on."""

from __future__ import annotations

from dataclasses import replace

import pytest

from sim.fit_rules import FitPart, Offered, Receiver, mates_of, may_fit
from sim.fleet import Standard

PART = FitPart("D1", "HPT-D1", ("N", "HPT"), 15_000, 4_000)
MODULE = Offered(module_serial="HPT-9", engine_type="N", module="HPT", standard="post", owner="Own", parts=(PART,))
PLACE = Receiver(
    engine_serial="E1",
    engine_type="N",
    module="HPT",
    rating="high",
    ratings=("high", "low"),
    neighbours=(("fan", "post"), ("LPT", "post")),
    owner="Own",
    tail="T-1",
    aircraft_type="N",
    etops_minutes=120,
)
MATES = mates_of(
    [
        Standard(engine_type="N", module="HPT", standard="post", mates_with_module="LPT", mates_with_standard="post"),
        Standard(engine_type="N", module="HPT", standard="pre", mates_with_module="LPT", mates_with_standard="pre"),
    ]
)


def test_a_module_that_meets_all_six_may_go_on() -> None:
    assert may_fit(MODULE, PLACE, mates=MATES) == ()


@pytest.mark.parametrize(
    ("module", "place", "test", "words"),
    [
        ({"engine_type": "W"}, {}, "position", "type W"),
        ({"module": "LPT"}, {}, "position", "is a LPT"),
        ({"parts": (PART._replace(belongs_to=("N", "LPT")),)}, {}, "position", "HPT-D1"),
        ({"standard": "pre"}, {}, "standard", "does not mate with LPT"),
        ({"standard": ""}, {}, "standard", "standard unknown"),
        ({"parts": (PART._replace(limit_cycles=None, cycles_left=0),)}, {}, "rating", "no limit is published"),
        ({"parts": (PART._replace(cycles_left=0),)}, {}, "rating", "0 cycles left of 15,000"),
        ({}, {"rating": "bump"}, "aircraft", "rating bump"),
        ({}, {"aircraft_type": "W"}, "aircraft", "flies engines of type W"),
        ({}, {"leaves_day": 0.0}, "aircraft", "has left"),
        ({}, {"worked_on_beside": ("HPT",)}, "operation", "like work on both engines"),
        ({"parts": (PART._replace(known=False, cycles_left=0),)}, {}, "papers", "not proven"),
        ({"parts": (PART._replace(trace_to_birth=False),)}, {"asks_for_trace": True}, "papers", "trace to birth"),
        ({"owner": "Lessor"}, {"exchange_rule": "never"}, "papers", "allows no exchange"),
        ({"owner": "Lessor", "exchange_rule": "never"}, {}, "papers", "belongs to Lessor"),
    ],
)
def test_each_refusal_gives_its_reason(
    module: dict[str, object], place: dict[str, object], test: str, words: str
) -> None:
    refusals = may_fit(replace(MODULE, **module), replace(PLACE, **place), mates=MATES)  # type: ignore[arg-type]
    assert [refusal.test for refusal in refusals] == [test]
    assert words in refusals[0].reason


def test_other_owners_may_be_fitted_where_the_lease_allows_it() -> None:
    for rule in ("own_back", "title_swap", ""):
        assert may_fit(replace(MODULE, owner="Lessor"), replace(PLACE, exchange_rule=rule), mates=MATES) == ()


def test_like_work_is_no_matter_without_etops() -> None:
    place = replace(PLACE, etops_minutes=0, worked_on_beside=("HPT",))
    assert may_fit(MODULE, place, mates=MATES) == ()


def test_more_life_can_be_asked_for_than_one_cycle() -> None:
    assert may_fit(MODULE, PLACE, mates=MATES, least_cycles=4_000) == ()
    assert may_fit(MODULE, PLACE, mates=MATES, least_cycles=4_001)[0].test == "rating"


def test_rows_of_standards_hold_in_both_directions() -> None:
    mirrored = mates_of(
        [Standard(engine_type="N", module="LPT", standard="post", mates_with_module="HPT", mates_with_standard="new")]
    )
    assert [refusal.test for refusal in may_fit(MODULE, PLACE, mates=mirrored)] == ["standard"]
