"""Queues and repair in closed form: what the simulation must agree with in its limits, and what formulas stand on.

Loss (Erlang 1917): ``a`` erlangs offered to N servers lose the share B, with B(0) = 1, B(n) = a B(n-1) / (n + a
B(n-1)). Waiting (M/M/c):    the chance to wait is C = B / (1 - rho (1 - B)), the mean queue Lq = C rho / (1 -
rho). Machine repair:     N machines wanted up, S spare ones, c repairmen: a birth and death chain over the number
down, births
                    ``min(N, N + S - x) lambda``, deaths ``min(x, c) mu``. With c unlimited the law depends on the
                    mean repair time alone (insensitivity), so it holds for any turn-time law.
Slots:              an induction every I days, unused ones lost, Poisson arrivals: mean wait I / (2 (1 - rho)),
the wait
                    of M/D/1 plus half an interval (a server that takes vacations of one interval).

Sources: Gross, Shortle, Thompson and Harris, *Fundamentals of Queueing Theory*, ch. 3; Rossetti, *Simulation
Modeling and Arena*, appendix on queueing; for vacations Fuhrmann and Cooper, *Operations Research* 33, 1985 (from
memory).
"""

from __future__ import annotations

import math
from typing import NamedTuple

from scipy.optimize import brentq

from sim.errors import RequestError


class Waiting(NamedTuple):
    """Long-run means: share of servers busy, chance to wait, number and time waiting, number and time in the
    system."""

    busy_frac: float
    wait_chance: float
    queue_mean: float
    wait_mean: float
    inside_mean: float
    stay_mean: float


class Repair(NamedTuple):
    """Machine repair: chance of x machines down for x = 0 … N + S, and what follows from it."""

    down_chance: tuple[float, ...]
    down_mean: float
    short_mean: float
    cover_frac: float
    rate: float


def erlang_loss(servers: int, offered: float) -> float:
    """Return the share of arrivals lost when ``offered`` erlangs meet so many servers and nobody waits."""
    if servers < 0 or offered < 0.0:
        raise RequestError("loss system", f"{servers} servers, {offered:g} erlangs", "numbers from 0")
    if offered == 0.0:
        return 1.0 if servers == 0 else 0.0
    lost = 1.0
    for n in range(1, servers + 1):
        lost = offered * lost / (n + offered * lost)
    return lost


def offered_at_loss(servers: int, lost_frac: float) -> float:
    """Return the load in erlangs at which so many servers lose that share of it."""
    if servers < 1 or not 0.0 < lost_frac < 1.0:
        raise RequestError("loss system", f"{servers} servers, loss {lost_frac:g}", "a server and a loss inside 0 to 1")
    high = 1.0
    while erlang_loss(servers, high) < lost_frac:
        high *= 2.0
    return float(brentq(lambda a: erlang_loss(servers, a) - lost_frac, 0.0, high, xtol=1e-12))


def waiting(*, arrivals: float, service: float, servers: int) -> Waiting:
    """Return the long-run means of M/M/c; ``arrivals`` and ``service`` (of one server) are rates in one unit of time.

    Raises RequestError when arrivals are not below what the servers can do.
    """
    offered = arrivals / service
    busy = offered / servers if servers else math.inf
    if busy >= 1.0:
        raise RequestError("waiting line", f"{busy:.3f} of the servers' time", "less than 1", "add servers")
    lost = erlang_loss(servers, offered)
    wait_chance = lost / (1.0 - busy * (1.0 - lost))
    queue = wait_chance * busy / (1.0 - busy)
    wait = queue / arrivals
    return Waiting(busy, wait_chance, queue, wait, queue + offered, wait + 1.0 / service)


def machine_repair(
    *, machines: int, failure: float, repair: float, repairmen: int | None = None, spares: int = 0
) -> Repair:
    """Return the long-run state of ``machines`` wanted up and ``spares`` beside them.

    ``failure``: rate of one machine that is up (a spare at rest does not fail); ``repair``: rate of one repairman;
    ``repairmen`` None: as many as there are machines down. ``short_mean``: machines wanted and missing on average;
    ``cover_frac``: share of time in which none is missing; ``rate``: failures in a unit of time.
    """
    if machines < 1 or spares < 0 or failure < 0.0 or repair <= 0.0 or (repairmen is not None and repairmen < 1):
        raise RequestError(
            "machine repair",
            f"{machines} machines, {spares} spares, rates {failure:g} and {repair:g}, {repairmen} repairmen",
            "a machine, rates above zero, a repairman",
        )
    weight, weights = 1.0, [1.0]
    for down in range(1, machines + spares + 1):
        up = min(machines, machines + spares - down + 1)
        at_work = down if repairmen is None else min(down, repairmen)
        weight *= up * failure / (at_work * repair)
        weights.append(weight)
    total = math.fsum(weights)
    chance = tuple(w / total for w in weights)
    short = math.fsum(p * max(0, x - spares) for x, p in enumerate(chance))
    return Repair(
        down_chance=chance,
        down_mean=math.fsum(p * x for x, p in enumerate(chance)),
        short_mean=short,
        cover_frac=math.fsum(chance[: spares + 1]),
        rate=(machines - short) * failure,
    )


def slot_wait_days(*, per_day: float, interval_days: float, spread: float = 1.0) -> float:
    """Return the mean wait for a slot when one comes every ``interval_days`` and ``per_day`` jobs arrive.

    ``spread``: variance over mean of the number that arrives in a long time; exact for 1 (arrivals at random),
    for others the queue's part is scaled by it as in heavy traffic (Kingman, *J. Royal Statistical Society B* 24,
    1962; from memory). Inf when jobs are not fewer than slots. With hardly any job it is half an interval.
    """
    load = per_day * interval_days
    return math.inf if load >= 1.0 else interval_days * (0.5 + spread * load / (2.0 * (1.0 - load)))
