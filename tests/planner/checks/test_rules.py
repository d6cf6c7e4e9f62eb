"""Every rule is kept by a sound fleet and broken by one planted fault, which it names with its row."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import pytest
import small_tables
from small_tables import Tables

from planner import tables as reading
from planner.checks.cells import CELL_RULES
from planner.checks.files import FILE_RULES
from planner.checks.rules import RULES, check, record_problems
from sim.errors import Problem

TERM = {"terms": "A", "engine_type": "N", "condition": "part_cycles", "per": "part", "least": "4000", "most": ""}
LEASE = {"lease": "L", "tail": "T-1", "engine_serial": "", "owner": "Own", "return_date": "2027-01-01", "terms": "A"}
LINK = {"serial": "HPT-01", "parent_serial": "E1", "on_date": "2019-01-01", "off_date": "2020-01-01"}
LINK |= {"cycles_on": "100", "hours_on": "200"}
READING = {"engine_serial": "E1", "date": "2026-01-01", "cycles_since_install": "900", "margin_degC": "30", "event": ""}
PAST = {"serial": "HPT-01", "engine_type": "N", "module": "HPT", "cause": "distress", "cycles_at_install": "900"}
PAST |= {"cycles_at_removal": "800", "ended": "failed"}
FOUND = {"serial": "HPT-01", "finding": "coating loss", "found_date": "2026-06-01", "remove_by_cycles": "500"}
CHANGE = {"tail": "T-1", "from_date": "2015-01-01", "rating": "high"}
CUT = {"part_number": "HPT-D1", "rating": "high", "limit_cycles": "7000", "valid_from": "2026-11-15"}
CUT |= {"serial_prefix": "H", "serial_from": "101", "serial_to": "102", "directive": "D-1", "source": "D-1"}

Spoil = Callable[[Tables], None]


class Fault(NamedTuple):
    spoil: Spoil
    table: str
    row: int | None
    column: str


def put(table: str, index: int, **cells: str) -> Spoil:
    """Set cells of a row; a column that is new is blank in the other rows."""

    def spoil(tables: Tables) -> None:
        for name in cells:
            for row in tables[table]:
                row.setdefault(name, "")
        tables[table][index].update(cells)

    return spoil


def add(table: str, *rows: dict[str, str]) -> Spoil:
    def spoil(tables: Tables) -> None:
        held = tables.setdefault(table, [])
        for row in rows:
            for name in row:
                for other in held:
                    other.setdefault(name, "")
            held.append({**dict.fromkeys(held[0] if held else {}, ""), **row})

    return spoil


def drop(table: str, index: int) -> Spoil:
    return lambda tables: tables[table].__delitem__(index)


def rename(table: str, old: str, new: str) -> Spoil:
    def spoil(tables: Tables) -> None:
        tables[table][:] = [{(new if k == old else k): v for k, v in row.items()} for row in tables[table]]

    return spoil


def both(*spoils: Spoil) -> Spoil:
    def spoil(tables: Tables) -> None:
        for one in spoils:
            one(tables)

    return spoil


def spare_module(**more: str) -> Spoil:
    row = {"module_serial": "HPT-06", "engine_type": "N", "module": "HPT", "engine_serial": "", "place": "pool"}
    return add("modules", row | {"base": "Home", "standard": "post"} | more)


BAD: dict[str, Fault] = {
    # tables and headings
    "files_are_known_tables": Fault(lambda tables: None, "", None, ""),
    "needed_tables_are_there": Fault(lambda tables: tables.pop("work") and None, "work", None, ""),
    "needed_tables_hold_rows": Fault(lambda tables: tables["work"].clear(), "work", None, ""),
    "headings_have_no_stray_spaces": Fault(rename("parts", "owner", "owner "), "parts", 1, "owner"),
    "headings_are_known": Fault(rename("parts", "owner", "ownr"), "parts", 1, "ownr"),
    "headings_are_not_repeated": Fault(rename("parts", "owner", "made_date "), "parts", 1, "made_date"),
    "required_columns_are_there": Fault(rename("parts", "part_number", "part_no"), "parts", 1, "part_number"),
    "settings_are_known": Fault(add("settings", {"name": "horizon", "value": "5"}), "settings", 5, "name"),
    "the_as_of_date_is_given": Fault(drop("settings", 0), "settings", None, "name"),
    # cells
    "cells_have_no_stray_spaces": Fault(put("parts", 1, owner="Own "), "parts", 3, "owner"),
    "installations_are_dated": Fault(add("installs", LINK | {"on_date": ""}), "installs", 2, "on_date"),
    "rating_changes_are_dated": Fault(
        add("rating_changes", CHANGE | {"from_date": ""}), "rating_changes", 2, "from_date"
    ),
    "prices_are_given": Fault(put("part_types", 1, price_usd=""), "part_types", 3, "price_usd"),
    "required_cells_are_filled": Fault(put("aircraft", 1, base=""), "aircraft", 3, "base"),
    "cells_hold_no_formulas": Fault(put("part_types", 0, name="=1+1"), "part_types", 2, "name"),
    "cells_hold_one_short_line": Fault(put("part_types", 0, name="x" * 500), "part_types", 2, "name"),
    "prices_are_in_one_currency": Fault(put("part_types", 0, price_usd="190000 EUR"), "part_types", 2, "price_usd"),
    "numbers_use_a_decimal_point": Fault(put("ratings", 1, thrust_kN="90,5"), "ratings", 3, "thrust_kN"),
    "numbers_have_no_thousands_signs": Fault(put("parts", 0, cycles_since_new="8 000"), "parts", 2, "cycles_since_new"),
    "numbers_stand_without_units": Fault(put("parts", 0, hours_since_new="16000 FH"), "parts", 2, "hours_since_new"),
    "numbers_are_numbers": Fault(put("parts", 0, cycles_since_new="many"), "parts", 2, "cycles_since_new"),
    "whole_numbers_are_whole": Fault(put("parts", 0, cycles_since_new="8000.5"), "parts", 2, "cycles_since_new"),
    "counts_and_amounts_are_not_negative": Fault(
        put("parts", 0, cycles_since_new="-8000"), "parts", 2, "cycles_since_new"
    ),
    "numbers_lie_within_their_range": Fault(put("ratings", 0, thrust_kN="10800"), "ratings", 2, "thrust_kN"),
    "dates_are_written_year_month_day": Fault(put("parts", 0, made_date="01/03/2017"), "parts", 2, "made_date"),
    "dates_exist_in_the_calendar": Fault(put("parts", 0, made_date="2017-02-30"), "parts", 2, "made_date"),
    "dates_are_of_this_age": Fault(put("parts", 0, made_date="1017-03-01"), "parts", 2, "made_date"),
    "flags_are_yes_or_no": Fault(put("parts", 0, trace_to_birth="true"), "parts", 2, "trace_to_birth"),
    "words_are_among_the_allowed": Fault(put("engines", 0, place="wings"), "engines", 2, "place"),
    # keys
    "keys_are_unique": Fault(put("engines", 1, engine_serial="E1"), "engines", 3, "engine_serial"),
    "references_exist": Fault(put("parts", 0, module_serial="fan-99"), "parts", 2, "module_serial"),
    "ratings_belong_to_their_type": Fault(put("part_history", 0, rating="hihg"), "part_history", 2, "rating"),
    "serials_do_not_look_alike": Fault(put("part_history", 0, part_serial="F1O1"), "part_history", 2, "part_serial"),
    # places
    "engine_positions_hold_one_engine": Fault(put("engines", 1, position="1"), "engines", 3, "position"),
    "engines_on_a_wing_name_tail_and_position": Fault(put("engines", 1, position=""), "engines", 3, "position"),
    "positions_exist_on_the_aircraft": Fault(put("engines", 1, position="3"), "engines", 3, "position"),
    "engines_are_of_the_type_of_their_aircraft": Fault(put("engines", 1, engine_type="W"), "engines", 3, "engine_type"),
    "aircraft_have_an_engine_in_every_position": Fault(
        put("engines", 1, place="spare", tail="", position="", base="Home"), "aircraft", 2, "positions"
    ),
    "modules_are_in_one_place": Fault(put("modules", 0, place="pool"), "modules", 2, "engine_serial"),
    "parts_are_in_one_place": Fault(
        add("parts", {"part_serial": "F101", "part_number": "FAN-D1", "module_serial": "fan-02"}),
        "parts",
        12,
        "module_serial",
    ),
    "engines_hold_each_module_once": Fault(put("modules", 2, engine_serial="E1"), "modules", 4, "engine_serial"),
    "engines_are_complete": Fault(put("modules", 0, engine_serial="", place="pool"), "engines", 2, "engine_serial"),
    "modules_are_of_the_type_of_their_engine": Fault(put("modules", 0, engine_type="W"), "modules", 2, "engine_type"),
    "parts_belong_in_their_module": Fault(put("parts", 0, module_serial="HPT-01"), "parts", 2, "module_serial"),
    "modules_hold_every_part_with_a_limit": Fault(
        put("parts", 0, module_serial="", place="shelf"), "modules", 2, "module_serial"
    ),
    "modules_mate_with_their_neighbours": Fault(put("modules", 1, standard="pre"), "modules", 3, "standard"),
    "spare_modules_mate_with_every_engine": Fault(spare_module(standard="pre"), "modules", 12, "standard"),
    "what_lies_in_a_shop_names_it": Fault(spare_module(place="shop", base=""), "modules", 12, "shop"),
    # counters and dates
    "counts_since_work_are_within_counts_since_new": Fault(
        put("modules", 0, cycles_since_restoration="8001"), "modules", 2, "cycles_since_restoration"
    ),
    "installation_counters_do_not_run_backwards": Fault(
        add("installs", LINK, LINK | {"on_date": "2021-01-01", "off_date": "", "cycles_on": "99"}),
        "installs",
        3,
        "cycles_on",
    ),
    "margin_counters_do_not_run_backwards": Fault(
        add("margins", READING, READING | {"date": "2026-02-01", "cycles_since_install": "899"}),
        "margins",
        3,
        "cycles_since_install",
    ),
    "removals_end_after_they_begin": Fault(add("removals", PAST), "removals", 2, "cycles_at_removal"),
    "hours_and_cycles_make_a_flight": Fault(
        put("aircraft", 0, hours_since_new="800"), "aircraft", 2, "hours_since_new"
    ),
    "hours_of_aircraft_are_flight_hours_as_of_their_parts": Fault(
        put("aircraft", 0, hours_since_new="17600"), "aircraft", 2, "hours_since_new"
    ),
    "planned_hours_are_flight_hours_as_of_the_past": Fault(
        put("aircraft", 0, hours_per_year="4900"), "aircraft", 2, "hours_per_year"
    ),
    "dates_are_in_order": Fault(put("part_history", 0, to_date="2017-06-30"), "part_history", 2, "to_date"),
    "what_has_happened_lies_in_the_past": Fault(
        put("part_history", 1, to_date="2026-07-02"), "part_history", 3, "to_date"
    ),
    "work_in_hand_is_not_overdue": Fault(
        spare_module(place="shop", shop="Alpha", ready_date="2026-06-30"), "modules", 12, "ready_date"
    ),
    # history
    "history_adds_up_to_cycles_since_new": Fault(
        put("parts", 0, cycles_since_new="8001"), "parts", 2, "cycles_since_new"
    ),
    "history_has_no_unexplained_gap": Fault(
        put("part_history", 0, to_date="2021-05-31", cycles="3400"), "part_history", 3, "from_date"
    ),
    "history_stretches_do_not_overlap": Fault(
        put("part_history", 1, from_date="2021-06-01"), "part_history", 3, "from_date"
    ),
    "history_begins_after_manufacture": Fault(put("parts", 0, made_date="2017-07-02"), "part_history", 2, "from_date"),
    "history_fits_into_its_days": Fault(put("part_history", 0, hours="36000"), "part_history", 2, "hours"),
    "ratings_flown_agree_with_those_of_the_tail": Fault(
        add("rating_changes", CHANGE | {"rating": "low"}, CHANGE | {"from_date": "2020-01-01"}),
        "part_history",
        2,
        "rating",
    ),
    "rating_changes_end_at_the_rating_of_today": Fault(
        add("rating_changes", CHANGE | {"rating": "low"}), "rating_changes", 2, "rating"
    ),
    "installations_do_not_overlap": Fault(
        add("installs", LINK, LINK | {"parent_serial": "E2", "on_date": "2019-06-01"}), "installs", 3, "on_date"
    ),
    "open_installations_agree_with_the_tables": Fault(
        add("installs", LINK | {"parent_serial": "E2", "off_date": ""}), "installs", 2, "parent_serial"
    ),
    # life
    "used_life_is_within_limit": Fault(put("part_limits", 0, limit_cycles="7999"), "parts", 2, "cycles_since_new"),
    "parts_that_fly_have_a_cycle_left": Fault(
        put("part_limits", 0, limit_cycles="8000"), "parts", 2, "cycles_since_new"
    ),
    "used_hours_are_within_limit": Fault(put("part_limits", 0, limit_hours="15999"), "parts", 2, "hours_since_new"),
    "age_is_within_limit": Fault(put("part_limits", 0, limit_days="3000"), "parts", 2, "made_date"),
    "parts_with_a_limit_in_hours_or_days_have_them_counted": Fault(
        both(put("part_limits", 0, limit_days="9000"), put("parts", 0, made_date="")), "parts", 2, "made_date"
    ),
    "life_of_every_part_is_known": Fault(put("parts", 0, status_substantiated="no"), "parts", 2, "cycles_since_new"),
    "limits_are_published_for_every_rating_flown": Fault(drop("part_limits", 1), "parts", 6, "part_number"),
    "announced_cuts_leave_life": Fault(add("part_limits", CUT), "parts", 3, "cycles_since_new"),
    "limits_do_not_rise_with_thrust": Fault(
        put("part_limits", 0, limit_cycles="25001"), "part_limits", 2, "limit_cycles"
    ),
    "serial_ranges_run_upwards": Fault(add("part_limits", CUT | {"serial_from": "103"}), "part_limits", 6, "serial_to"),
    "serials_can_be_held_against_ranges": Fault(
        both(add("part_limits", CUT), put("parts", 1, part_serial="H101A")), "parts", 3, "part_serial"
    ),
    "ranges_hold_a_serial": Fault(add("part_limits", CUT | {"serial_prefix": "Q"}), "part_limits", 6, "serial_prefix"),
    "directives_cut_limits": Fault(
        add("part_limits", CUT | {"limit_cycles": "15000"}), "part_limits", 6, "limit_cycles"
    ),
    "limits_name_their_source": Fault(put("part_limits", 0, source=""), "part_limits", 2, "source"),
    # catalogue
    "work_has_every_level_of_every_module": Fault(drop("work", 0), "module_types", 2, "module"),
    "shares_of_work_add_up_to_one": Fault(put("work", 0, labour_frac="0.6"), "work", 2, "material_frac"),
    "deeper_work_costs_more": Fault(put("work", 2, cost_usd="200000"), "work", 4, "cost_usd"),
    "visits_have_every_kind": Fault(drop("visits", 0), "engine_types", 2, "engine_type"),
    "every_type_has_a_shop": Fault(put("shops", 0, engine_type="W"), "engine_types", 2, "engine_type"),
    "shops_have_a_turn_time_for_every_visit": Fault(drop("shop_work", 0), "shops", 2, "shop"),
    "every_type_has_ratings_modules_and_wear": Fault(
        lambda tables: [row.update(engine_type="W") for row in tables["wear"]] and None,
        "engine_types",
        2,
        "engine_type",
    ),
    "ratings_that_fly_have_wear": Fault(
        lambda tables: tables["wear"].__delitem__(slice(2, 4)), "aircraft", 3, "rating"
    ),
    "hazards_can_be_drawn": Fault(put("hazards", 0, scale=""), "hazards", 2, "scale"),
    "tails_of_turn_times_are_not_below_their_medians": Fault(
        put("shop_work", 0, days_p90="90"), "shop_work", 2, "days_p90"
    ),
    "modules_stand_behind_modules_that_exist": Fault(put("module_types", 1, behind="LPT"), "module_types", 3, "behind"),
    "no_module_stands_behind_itself": Fault(put("module_types", 0, behind="HPT"), "module_types", 2, "behind"),
    "every_month_has_its_share": Fault(drop("season", 4), "season", None, "month"),
    "shares_of_the_year_average_one": Fault(put("season", 0, share="3"), "season", None, "share"),
    "prices_are_in_dollars": Fault(add("settings", {"name": "currency", "value": "EUR"}), "settings", 5, "value"),
    "part_prices_are_of_one_order": Fault(
        add(
            "part_types",
            {"part_number": "FAN-D2", "engine_type": "N", "module": "fan", "price_usd": "240000"},
            {"part_number": "FAN-D3", "engine_type": "N", "module": "fan", "price_usd": "240"},
        ),
        "part_types",
        5,
        "price_usd",
    ),
    "parts_have_a_price": Fault(put("part_types", 0, price_usd="0"), "part_types", 2, "price_usd"),
    # contracts
    "leases_name_one_aircraft_or_engine": Fault(add("leases", LEASE | {"engine_serial": "E1"}), "leases", 2, "tail"),
    "leases_have_terms": Fault(
        both(add("leases", LEASE | {"terms": "B"}), add("lease_terms", TERM)), "leases", 2, "terms"
    ),
    "conditions_have_a_bound": Fault(add("lease_terms", TERM | {"least": ""}), "lease_terms", 2, "least"),
    "lease_returns_lie_ahead": Fault(add("leases", LEASE | {"return_date": "2026-06-30"}), "leases", 2, "return_date"),
    "leased_aircraft_belong_to_their_lessor": Fault(add("leases", LEASE | {"owner": "A"}), "leases", 2, "owner"),
    "modules_fly_on_engines_of_their_owner": Fault(put("modules", 0, owner="A"), "modules", 2, "owner"),
    "parts_fly_in_modules_of_their_owner": Fault(put("parts", 0, owner="A"), "parts", 2, "owner"),
    "bought_ratings_say_what_follows": Fault(
        put("aircraft", 0, rating_until="2027-01-01"), "aircraft", 2, "rating_after"
    ),
    "ratings_do_not_expire": Fault(
        put("aircraft", 0, rating_until="2027-01-01", rating_after="low"), "aircraft", 2, "rating_until"
    ),
    "aircraft_have_at_most_one_weak_engine": Fault(put("part_limits", 3, limit_cycles="8500"), "aircraft", 3, "tail"),
    "leased_aircraft_have_no_engine_weak_in_life_and_margin": Fault(
        both(
            add("leases", LEASE | {"tail": "T-2"}),
            put("part_limits", 3, limit_cycles="8500"),
            put("modules", 5, margin_lost_degC="101"),
        ),
        "engines",
        4,
        "engine_serial",
    ),
    "returns_within_a_year_leave_the_cycles_that_terms_ask": Fault(
        both(add("leases", LEASE), add("lease_terms", TERM | {"least": "6100"})), "leases", 2, "return_date"
    ),
    "agreed_removals_leave_an_engine_on_each_tail": Fault(
        add(
            "agreed",
            {"date": "2026-10-01", "what": "removal", "serials": "E3"},
            {"date": "2026-10-20", "what": "removal", "serials": "E4"},
        ),
        "agreed",
        3,
        "serials",
    ),
    "agreed_serials_are_known": Fault(
        add("agreed", {"date": "2026-10-01", "what": "removal", "serials": "E9"}), "agreed", 2, "serials"
    ),
    "findings_name_a_serial_of_the_fleet": Fault(add("watch", FOUND | {"serial": "HPT-99"}), "watch", 2, "serial"),
    "changes_of_use_name_a_tail": Fault(
        add(
            "utilisation",
            {"tail": "T-9", "from_date": "2027-01-01", "hours_per_year": "3000", "cycles_per_year": "1800"},
        ),
        "utilisation",
        2,
        "tail",
    ),
}

BAD_FILES: dict[str, tuple[bytes, int | None]] = {
    "files_are_of_a_size_that_can_be_tables": (b"base\n" + b"x" * 64_000_000, None),
    "text_is_written_in_utf_8": (b"base,environment\nHome,1\nMal\xe9,1\n", 3),
    "text_holds_no_control_characters": (b"base,environment\nHome,1\n\x00\x00,1\n", 3),
    "cells_are_parted_by_commas": (b"base;environment\nHome;1,0\n", 1),
    "quotes_are_closed_and_rows_can_be_told_apart": (b'base,environment\n"Home,1\n', None),
    "rows_are_as_wide_as_the_headings": (b"base,environment\nHome,1,45\n", 2),
}
IN_WORKBOOKS = {"serials_are_written_as_text"}  # tested with the workbook


def problems_of(tables: Tables) -> list[Problem]:
    records, found = reading.read_sheets(small_tables.sheets(tables))
    listing = reading.Listing([*tables, *(["partz"] if len(tables["parts"]) == 0 else [])])
    missing = reading.MISSING_RULE
    more = [
        Problem(f.file, f.table, f.row, f.column, missing.severity, missing.name, f.found, f.expected, f.message)
        for f in missing.check(listing)
    ]
    return [*found, *more, *record_problems(records)]


def test_every_rule_has_a_planted_fault() -> None:
    names = [rule.name for rule in RULES]
    assert len(names) == len(set(names))
    assert len(names) >= 40
    assert set(names) == {*BAD, *BAD_FILES} | IN_WORKBOOKS


def test_a_sound_fleet_keeps_every_rule(tmp_path: Path) -> None:
    _, found = check(small_tables.write(tmp_path / "fleet", small_tables.small_tables()))
    assert found == ()


def test_richer_sound_tables_keep_every_rule() -> None:
    """The good side of the rules on tables that the small fleet does not have."""
    tables = small_tables.small_tables()
    add("leases", LEASE)(tables)
    add("lease_terms", TERM)(tables)
    add("installs", LINK, LINK | {"on_date": "2020-01-01", "off_date": "", "cycles_on": "3000", "hours_on": "300"})(
        tables
    )
    add("margins", READING, READING | {"date": "2026-02-01", "cycles_since_install": "1000"})(tables)
    add("removals", PAST | {"cycles_at_removal": "1000"})(tables)
    add("watch", FOUND)(tables)
    add("rating_changes", CHANGE)(tables)
    add("part_limits", CUT | {"valid_from": "2020-01-01", "limit_cycles": "14000"})(tables)
    add("agreed", {"date": "2026-10-01", "what": "removal", "serials": "E3"})(tables)
    spare_module()(tables)
    assert [p for p in problems_of(tables) if p.rule != "modules_hold_every_part_with_a_limit"] == []


@pytest.mark.parametrize("name", sorted(set(BAD) - {"files_are_known_tables"}))
def test_a_planted_fault_is_found_by_its_rule_and_row(name: str) -> None:
    fault = BAD[name]
    tables = small_tables.small_tables()
    fault.spoil(tables)
    found = [p for p in problems_of(tables) if p.rule == name]
    assert [(p.table, p.row, p.column) for p in found[:1]] == [(fault.table, fault.row, fault.column)]
    rule = next(rule for rule in RULES if rule.name == name)
    assert found[0].severity == rule.severity
    assert found[0].found
    assert found[0].expected
    assert found[0].message in found[0].sentence()


@pytest.mark.parametrize("name", sorted(BAD_FILES))
def test_a_file_that_is_no_table_is_told_and_the_rest_is_read(tmp_path: Path, name: str) -> None:
    data, row = BAD_FILES[name]
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    (folder / "bases.csv").write_bytes(data)
    (folder / "shops.csv").write_text("shop,engine_type\nAlpha,W\n")
    records, found = check(folder)
    told = [(p.file, p.row, p.severity) for p in found if p.rule == name]
    assert told == [("bases.csv", row, "stops")]
    assert len(records["shops"]) == 1
    assert any(p.rule == "every_type_has_a_shop" for p in found)


def test_an_unknown_file_is_told_with_the_nearest_name(tmp_path: Path) -> None:
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    (folder / "aircrafts.csv").write_text("tail\n")
    (folder / "notes.md").write_text("not a table, and not meant as one")
    (folder / "dirty").mkdir()
    _, found = check(folder)
    assert [(p.rule, p.file, p.severity) for p in found] == [("files_are_known_tables", "aircrafts.csv", "warns")]
    assert "did you mean aircraft?" in found[0].message


def test_a_flood_of_one_kind_is_cut_and_counted() -> None:
    tables = small_tables.small_tables()
    row = tables["part_history"][0]
    tables["part_history"] += [row | {"part_serial": f"Z{i}"} for i in range(1000)]
    told = [p for p in problems_of(tables) if p.rule == "references_exist"]
    assert len(told) == 201
    assert told[-1].message.startswith("800 more")


def test_rules_for_cells_and_files_stop() -> None:
    assert {rule.severity for rule in (*CELL_RULES, *FILE_RULES)} == {"stops"}


@pytest.mark.parametrize("text", ["8000", "8000.0", "+8000", "0"])
def test_ways_to_write_a_whole_number_that_are_taken(text: str) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["cycles_since_new"] = text
    assert [p for p in problems_of(tables) if p.severity == "stops"] == []
