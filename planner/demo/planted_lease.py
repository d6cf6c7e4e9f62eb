"""A lease that fails its return on one part alone, while another engine would pass."""

from __future__ import annotations

import datetime as dt

from planner.demo.book import Book
from planner.demo.type_tables import Row

RETURN_DATE = dt.date(2027, 3, 31)
_SHORT_CYCLES = 600  # by which the part misses what the terms ask
_PART = "NHC-03"
_MARGIN_TO_SPARE_DEGC, _CYCLES_TO_SPARE = 6.0, 150
_UNLUCKY_FACTOR = 1.2


def one_part_fails_a_return(book: Book, used: set[str]) -> tuple[str, str, tuple[str, ...]] | None:
    """Bring a return forward whose engines pass, then give one part of one of them an older life."""
    for tail, lease in book.leases.items():
        engines = book.on_tail.get(tail, [])
        if tail in used or len(engines) < 2 or engines[0]["engine_type"] != "N":
            continue
        least = _least(book, lease)
        failing, sister = engines
        flown = book.flown_by(tail, RETURN_DATE)
        if not all(_passes(book, engine, lease, tail=tail) for engine in engines):
            continue
        part = next(p for p in book.parts_of(failing) if p["part_number"] == _PART)
        book.age(part, rating=book.rating_of(failing), left=flown + least - _SHORT_CYCLES)
        lease["return_date"] = RETURN_DATE.isoformat()
        used.add(tail)
        what = f"lease {lease['lease']} fails its return on one part; the sister engine would pass"
        return "fails_on_one_part", what, (tail, failing["engine_serial"], part["part_serial"], sister["engine_serial"])
    return None


def _least(book: Book, lease: Row) -> int:
    return next(int(r["least"]) for r in _terms(book, lease) if r["condition"] == "part_cycles")


def _terms(book: Book, lease: Row) -> list[Row]:
    kind = book.tails[lease["tail"]]["engine_type"]
    return [r for r in book.tables["lease_terms"] if r["terms"] == lease["terms"] and r["engine_type"] == kind]


def _passes(book: Book, engine: Row, lease: Row, *, tail: str) -> bool:
    """Return whether an engine passes every condition on the day of return, with something to spare."""
    flown, row = book.flown_by(tail, RETURN_DATE), book.tails[tail]
    hours = flown * float(row["hours_per_year"]) / float(row["cycles_per_year"])
    rating = book.rating_of(engine)
    left = min(book.left(part, rating) for part in book.parts_of(engine)) - flown - _CYCLES_TO_SPARE
    margin = book.margin(engine) - _MARGIN_TO_SPARE_DEGC - _lost(book, row, rating, flown)
    longest = max(float(m["hours_since_restoration"]) for m in book.modules[engine["engine_serial"]]) + hours
    threshold = next(
        float(r["removal_margin_degC"]) for r in book.tables["engine_types"] if r["engine_type"] == row["engine_type"]
    )
    for term in _terms(book, lease):
        condition, least, most = term["condition"], float(term.get("least") or 0), float(term.get("most") or 0)
        fits = {
            "part_cycles": left > least,
            "hours_since_restoration": longest < most,
            "margin": margin > least,
            "cycles_to_removal": left > least and margin - _lost(book, row, rating, round(least)) > threshold,
            "own_serials": True,
        }
        if not fits[condition]:
            return False
    return True


def _lost(book: Book, tail: Row, rating: str, cycles: int) -> float:
    """Return the margin that a tail costs in so many cycles, by the wear table and its base, with luck against it."""
    rows = [r for r in book.tables["wear"] if r["engine_type"] == tail["engine_type"] and r["rating"] == rating]
    ratio = float(tail["hours_per_year"]) / float(tail["cycles_per_year"])
    steady = sum(float(r["loss_degC_per_1000_cycles"]) + ratio * float(r["loss_degC_per_1000_hours"]) for r in rows)
    environment = next(float(r["environment"]) for r in book.tables["bases"] if r["base"] == tail["base"])
    return steady * environment * _UNLUCKY_FACTOR * cycles / 1000.0
