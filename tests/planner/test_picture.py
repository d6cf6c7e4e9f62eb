"""A picture holds the fleet as it is on a day; looking ahead flies copies and leaves it as it was."""

import dataclasses

import pytest

from planner.picture import cloned, flown_to, foreseen, picture
from sim.errors import RequestError
from sim.fleet import Aircraft, Fleet, PartLimit, Rating, Utilisation, WearRow
from tests.sim.builders import tiny_fleet


def on_tail(fleet: Fleet, tail: str, **change: object) -> Fleet:
    rows = tuple(dataclasses.replace(a, **change) if a.tail == tail else a for a in fleet.aircraft)
    return dataclasses.replace(fleet, aircraft=rows)


def two_ratings() -> Fleet:
    fleet = tiny_fleet()
    return dataclasses.replace(
        fleet,
        ratings=(*fleet.ratings, Rating(engine_type="T", rating="two", thrust_kN=110.0, new_margin_degC=80.0)),
        wear=(*fleet.wear, *(WearRow(engine_type="T", rating="two", module=m) for m in ("fan", "core"))),
        part_limits=(
            *fleet.part_limits,
            PartLimit(part_number="fan-disk", rating="two", limit_cycles=10_000),
            PartLimit(part_number="core-disk", rating="two", limit_cycles=500),
        ),
    )


def test_the_part_that_limits_is_foreseen_on_its_last_cycle() -> None:
    view = picture(tiny_fleet())
    removal = foreseen(view, view.engine("E1"), "A1")
    assert (removal.cycles, removal.cause, removal.slot) == (1000, "limit", 1)


def test_a_change_of_rating_changes_the_count_from_its_day() -> None:
    """400 of 1,000 cycles at the old rating by the change leave 0.6 of 500 at the new one."""
    view = picture(on_tail(two_ratings(), "A1", rating_until_day=100.0, rating_after="two"))
    use = view.uses["A1"]
    assert use.whole_cycles(100.0) == 400
    assert foreseen(view, view.engine("E1"), "A1").cycles == 400 + 300


def test_a_change_of_use_moves_the_day_and_not_the_cycle() -> None:
    fleet = dataclasses.replace(
        tiny_fleet(), utilisation=(Utilisation(tail="A1", from_day=100.0, hours_per_year=730.5, cycles_per_year=730.5),)
    )
    view = picture(fleet)
    use = view.uses["A1"]
    assert foreseen(view, view.engine("E1"), "A1").cycles == 1000
    assert use.day(1000) == pytest.approx(100.0 + 600 / 2, abs=0.2)
    assert use.cycles(use.day(777.0)) == pytest.approx(777.0)
    assert use.hours(1000) == pytest.approx(1000.0)


def test_flying_a_copy_leaves_the_picture_as_it_was() -> None:
    view = picture(tiny_fleet())
    engine = view.engine("E1")
    later = flown_to(view, engine, "A1", cycles=300)
    assert (later.csn, later.modules[1].csr) == (300, 300)
    assert (engine.csn, engine.modules[1].csr) == (0, 0)
    assert foreseen(view, later, "A1", day=view.uses["A1"].day(300)).cycles == 700
    assert cloned(engine).modules[0].parts == engine.modules[0].parts


def test_a_day_later_shops_and_shelves_have_moved_on() -> None:
    fleet = tiny_fleet()
    rows = tuple(
        dataclasses.replace(e, place="shop", shop="S", visit="core", inducted_day=-5.0, ready_day=20.0)
        if e.engine_serial == "E3"
        else e
        for e in fleet.engines
    )
    fleet = dataclasses.replace(fleet, engines=rows)
    assert picture(fleet).world.engine_pools["T"].engines == []
    assert [e.serial for e in picture(fleet, day=30.0).world.engine_pools["T"].engines] == ["E3"]


def test_an_unknown_engine_is_named_with_the_nearest() -> None:
    with pytest.raises(RequestError, match=r"found E9, expected an engine serial of the records; did you mean E\d"):
        picture(tiny_fleet()).engine("E9")


def test_prices_rise_and_are_discounted_by_day() -> None:
    view = picture(tiny_fleet())
    assert view.price("part", "core-disk", day=0.0) == 40_000
    assert view.discount(0.0) == 1.0
    aircraft: Aircraft = view.fleet.aircraft[0]
    assert view.lease_of(aircraft.tail) is None
