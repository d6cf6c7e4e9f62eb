"""An engine that has come off, or will: on which day, why, in which state, and what a planner sees then."""

from __future__ import annotations

from planner.picture import Picture, flown_to, foreseen, picture
from planner.ways_out import Off
from sim.errors import RequestError
from sim.fleet import Fleet
from sim.removal import FAR, Removal


class Coming:
    """Pictures of one fleet by day, each made once."""

    def __init__(self, fleet: Fleet) -> None:
        self.fleet = fleet
        self._pictures: dict[float, Picture] = {}

    def on(self, day: float) -> Picture:
        if day not in self._pictures:
            self._pictures[day] = picture(self.fleet, day=day)
        return self._pictures[day]

    @property
    def today(self) -> Picture:
        return self.on(0.0)

    def tail_of(self, serial: str) -> str:
        """Return the tail that an engine hangs on, or that it is planned for when it has just come off."""
        row = self.today.engine_rows[self.today.engine(serial).serial]
        if row.place in ("wing", "leased_in") and row.tail:
            return row.tail
        same = [a.tail for a in self.fleet.aircraft if a.engine_type == row.engine_type]
        if row.tail in same:
            return row.tail
        if not same:
            raise RequestError("engine", serial, f"an aircraft of type {row.engine_type}")
        return same[0]

    def removal(self, serial: str) -> Removal:
        """Return what takes an engine off next, as it can be foreseen from today."""
        return foreseen(self.today, self.today.engine(serial), self.tail_of(serial))

    def off(self, serial: str, *, early_days: float = 0.0) -> Off:
        """Return an engine on the day on which it comes off, ``early_days`` before the last possible one.

        Raises RequestError when the engine is unknown, lies ready as a spare, is in work, or has nothing that limits.
        """
        row = self.today.engine_rows[self.today.engine(serial).serial]
        if row.place == "spare":
            raise RequestError(
                "engine", serial, "an engine that flies or has just come off", "it lies ready as a spare"
            )
        if row.place == "shop" and row.inducted_day is not None:
            raise RequestError("engine", serial, "an engine that flies or has just come off", "its visit has begun")
        tail, removal = self.tail_of(serial), self.removal(serial)
        if removal.cycles >= FAR:
            raise RequestError("engine", serial, "an engine with a limit or a margin ahead", "nothing limits it")
        use = self.today.uses[tail]
        day = 0.0 if row.place == "shop" else max(0.0, use.day(removal.cycles) - early_days)
        cycles = min(removal.cycles, use.whole_cycles(day)) if early_days else removal.cycles
        if row.place == "shop":
            cycles = 0
        view = self.on(day)
        twin = flown_to(view, view.engine(serial), tail, cycles=cycles)
        seen = view.world.matching.view(view.tails[tail], twin, removal._replace(cycles=0))
        return Off(view, twin, tail, seen)


def off_now(fleet: Fleet, serial: str) -> Off:
    """Return one engine on the day on which it comes off."""
    return Coming(fleet).off(serial)
