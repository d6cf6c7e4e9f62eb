"""A fleet read for a plan: the fleet itself, the fingerprint of its records, and what had to be assumed."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

from planner import fingerprint
from planner.assemble import load
from sim.fleet import Fleet

DEMO = "DEMO: the fleet is invented"


class Read(NamedTuple):
    fleet: Fleet
    inputs: str
    warnings: tuple[str, ...]


def read(path: Path) -> Read:
    """Return a fleet with its fingerprint. Raises RecordsError or RequestError when it cannot be read."""
    fleet = load(path)
    demo = (DEMO,) if fleet.settings.demo else ()
    return Read(fleet, fingerprint.folder(path), (*demo, *fleet.assumptions))
