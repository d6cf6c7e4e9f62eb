"""The complications planted in the demo, each a fact that the program must find.

Each function plants one, in place, and returns what it planted, or nothing where the fleet is too small to hold it.
No engine or tail is used twice, so that each stands alone.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import NamedTuple

from planner.demo.book import Book
from planner.demo.planted_lease import one_part_fails_a_return
from planner.demo.type_tables import Row

LITTLE_LEFT_CYCLES = 120
DIRECTIVE, DIRECTIVE_FROM = "Directive 2026-17", "2026-11-15"
DIRECTIVE_LIMITS = {"low": 14_000, "mid": 11_800, "high": 8_300}
RATING_UNTIL = "2027-06-30"
_DISK, _HIT, _OVER = "NHT-01", 6, 2
_FLOWN_BEFORE, _PAST = 1200, 600  # cycles: more than is flown before the day; by how much the two are past
_BASE_DISK, _BASE_LEFT, _BOUGHT = "WHT-01", 7400, 500_000
_WEAK_MARGINS_DEGC = (9.4, 10.1)  # both below the setting weak_margin_degC
_WEAK_CYCLES = 440  # below the setting weak_cycles
_TOGETHER_CYCLES = (690, 705)  # above it, a few days apart


Found = tuple[str, str, tuple[str, ...]] | None  # name, what, serials


class Planted(NamedTuple):
    """One complication: its name, what it is, and the serials and tails that it shows on."""

    name: str
    what: str
    serials: tuple[str, ...]


def plant(tables: dict[str, list[Row]]) -> tuple[Planted, ...]:
    """Plant all that the fleet has room for, and return them."""
    book, used = Book(tables), set[str]()
    found = []
    for one in _PLANTS:
        planted = one(book, used)
        if planted is not None:
            found.append(Planted(*planted))
    return tuple(found)


def _pairs(book: Book, used: set[str], prefix: str, *, leased: bool | None = None) -> Iterator[tuple[str, list[Row]]]:
    """Yield unused tails of sub-fleets whose code begins so, with their engines; ``leased`` None: either."""
    for tail, row in book.tails.items():
        engines = book.on_tail.get(tail, [])
        if tail in used or row["entry_date"] or not row["sub_fleet"].startswith(prefix) or len(engines) < 2:
            continue
        if leased is None or leased == (tail in book.leases):
            yield tail, engines


def _little_left_on_a_leased_tail(book: Book, used: set[str]) -> Found:
    engines = [e for _, both in _pairs(book, used, "N", leased=True) for e in both if e["owner"]]
    if not engines:
        return None
    engine = min(engines, key=lambda e: (book.margin(e), e["engine_serial"]))
    rating = book.rating_of(engine)
    part = next(p for p in book.parts_of(engine) if p["part_number"] == "NHT-02")
    if book.left(part, rating) <= LITTLE_LEFT_CYCLES:
        return None
    book.age(part, rating=rating, left=LITTLE_LEFT_CYCLES)
    book.set_margin(engine, 8.0)
    used.add(engine["tail"])
    what = f"{LITTLE_LEFT_CYCLES} cycles left on one part and little margin, on a leased tail"
    return "little_left", what, (engine["engine_serial"], part["part_serial"], engine["tail"])


def _other_owner(book: Book, used: set[str]) -> Found:
    """The LPTs of two lessors' engines have changed places in the past: only the titles tell."""
    first: tuple[Row, Row] | None = None
    for _, both in _pairs(book, used, "N", leased=True):
        engine = both[0]
        lpt = next(m for m in book.modules[engine["engine_serial"]] if m["module"] == "LPT")
        if first is None:
            first = engine, lpt
        elif engine["owner"] != first[0]["owner"]:
            for module, owner in ((lpt, first[0]["owner"]), (first[1], engine["owner"])):
                module["owner"] = owner
                for part in book.parts_in(module):
                    part["owner"] = owner
            used |= {engine["tail"], first[0]["tail"]}
            what = "two LPTs fly in engines of other owners than theirs"
            return "other_owner", what, (first[1]["module_serial"], lpt["module_serial"])
    return None


def _two_weak(book: Book, used: set[str]) -> Found:
    for tail, both in _pairs(book, used, "NB", leased=False):
        for engine, margin in zip(both, _WEAK_MARGINS_DEGC, strict=True):
            book.set_margin(engine, margin)
        used.add(tail)
        return "two_weak", "two engines with little margin on one aircraft", (tail, *_serials(both))
    return None


def _two_weak_etops(book: Book, used: set[str]) -> Found:
    for tail, both in _pairs(book, used, "NC", leased=False):
        part = next(p for p in book.parts_of(both[1]) if p["part_number"] == "NHT-03")
        rating = book.rating_of(both[1])
        if book.left(part, rating) <= _WEAK_CYCLES:
            continue
        book.set_margin(both[0], _WEAK_MARGINS_DEGC[0])
        book.age(part, rating=rating, left=_WEAK_CYCLES)
        used.add(tail)
        what = "one engine with little margin and one with little life on an ETOPS aircraft"
        return "two_weak_etops", what, (tail, *_serials(both))
    return None


def _away_together(book: Book, used: set[str]) -> Found:
    """Both engines of an ETOPS tail reach a limit within days: a plan by limits alone sends both away together."""
    best: tuple[float, str, list[Row], list[Row]] | None = None
    for tail, both in _pairs(book, used, "WA"):
        parts = [next(p for p in book.parts_of(e) if p["part_number"] == "WHT-03") for e in both]
        least = min(book.least_left(e) for e in both)
        margin = min(book.margin(e) for e in both)
        if least > max(_TOGETHER_CYCLES) and (best is None or margin > best[0]):
            best = margin, tail, both, parts
    if best is None:
        return None
    _, tail, both, parts = best
    for engine, part, left in zip(both, parts, _TOGETHER_CYCLES, strict=True):
        book.age(part, rating=book.rating_of(engine), left=left)
    used.add(tail)
    what = "both engines of an ETOPS aircraft reach a limit within days of each other"
    return "away_together", what, (tail, *_serials(both))


def _two_ratings(book: Book, _: set[str]) -> Found:
    """The past has flown them so: what flew on a tail whose rating changed counts at both."""
    changed = {row["tail"] for row in book.tables["rating_changes"]}
    flown: dict[str, set[str]] = {}
    for row in book.tables["part_history"]:
        if row.get("tail") in changed:
            flown.setdefault(row["engine_serial"], set()).add(row["rating"])
    both = sorted(serial for serial, ratings in flown.items() if len(ratings) > 1)
    return ("two_ratings", "engines flown at two ratings", tuple(both)) if both else None


def _old_standard(book: Book, _: set[str]) -> Found:
    """The spare HPT of type N stands at the older standard; the shelf has it so."""
    shelf = [m["module_serial"] for m in book.modules.get("", []) if m["module"] == "HPT" and m["standard"] == "pre"]
    what = "a pre-modification HPT that does not mate with some engines"
    return ("old_standard", what, tuple(shelf)) if shelf else None


def _base_only(book: Book, _: set[str]) -> Found:
    """A spare of type W was built up with a used disk that is not approved at the higher rating: a limit of one cycle
    there."""
    spares = [e for e in book.engines.values() if e["engine_type"] == "W" and e["place"] == "spare"]
    if not spares:
        return None
    engine = spares[-1]
    part = next(p for p in book.parts_of(engine) if p["part_number"] == _BASE_DISK)
    number = number_of(part) + _BOUGHT
    book.renew(part, serial=f"{_BASE_DISK.replace('-', '')}-{number}")
    book.age(part, rating="base", left=_BASE_LEFT)
    engine["standard"] = "base"
    row = _limit_row(_BASE_DISK, "plus", 1, numbers=(number, number), source="Service bulletin W-72")
    book.tables["part_limits"].append(row)
    what = "a spare of type W that may fly at the lower rating only"
    return "base_only", what, (engine["engine_serial"], part["part_serial"])


def _rating_that_expires(book: Book, used: set[str]) -> Found:
    for tail, _ in _pairs(book, used, "NA"):
        if book.tails[tail]["rating"] == "high":
            book.tails[tail] |= {"rating_until": RATING_UNTIL, "rating_after": "mid"}
            used.add(tail)
            return "rating_expires", f"a bought rating ends on {RATING_UNTIL}", (tail,)
    return None


def _directive(book: Book, used: set[str]) -> Found:
    """Six disks whose numbers follow each other have less life from a day on; two of them, bought used, have flown
    more than that already."""
    disks: dict[int, tuple[Row, Row]] = {}
    for engine in book.engines.values():
        if engine["engine_type"] == "N" and engine["place"] == "wing" and engine["tail"] not in used:
            part = next(p for p in book.parts_of(engine) if p["part_number"] == _DISK)
            disks[number_of(part)] = engine, part
    every = sorted(number_of(part) for part in book.tables["parts"] if part["part_number"] == _DISK)
    for first in range(len(every) - _HIT + 1):
        window = every[first : first + _HIT]
        hit = [disks[number] for number in window if number in disks]
        lives = [book.left(part, book.rating_of(engine), DIRECTIVE_LIMITS) for engine, part in hit]
        if len(hit) < _HIT or min(lives) < _FLOWN_BEFORE or hit[0][0]["tail"] == hit[-1][0]["tail"]:
            continue
        for engine, part in (hit[0], hit[-1]):
            rating = book.rating_of(engine)
            book.age(part, rating=rating, left=book.left(part, rating) - lives[hit.index((engine, part))] - _PAST)
        for rating, limit in DIRECTIVE_LIMITS.items():
            row = _limit_row(_DISK, rating, limit, numbers=(window[0], window[-1]), source=DIRECTIVE)
            book.tables["part_limits"].append(row | {"valid_from": DIRECTIVE_FROM})
        used |= {engine["tail"] for engine, _ in hit}
        what = f"{DIRECTIVE} cuts the life of {_HIT} disks, {_OVER} of them are past the new limit on its first day"
        return "directive", what, tuple(part["part_serial"] for _, part in hit)
    return None


def number_of(part: Row) -> int:
    """Return the number that a part's serial ends in."""
    return int(part["part_serial"].rpartition("-")[2])


def _limit_row(part_number: str, rating: str, limit: int, *, numbers: tuple[int, int], source: str) -> Row:
    return {
        "part_number": part_number,
        "rating": rating,
        "limit_cycles": limit,
        "serial_prefix": f"{part_number.replace('-', '')}-",
        "serial_from": numbers[0],
        "serial_to": numbers[1],
        "directive": source,
        "source": source,
    }


def _serials(engines: list[Row]) -> tuple[str, ...]:
    return tuple(engine["engine_serial"] for engine in engines)


_PLANTS: tuple[Callable[[Book, set[str]], Found], ...] = (
    one_part_fails_a_return,
    _little_left_on_a_leased_tail,
    _other_owner,
    _two_weak,
    _two_weak_etops,
    _away_together,
    _two_ratings,
    _old_standard,
    _base_only,
    _rating_that_expires,
    _directive,
)
