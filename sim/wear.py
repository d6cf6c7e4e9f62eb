"""How a module loses margin, in closed form: loss over cycles, its integral, and the cycle at which a margin is met.

A module's state is its loss in *units of its early loss*, so that it can move to another rating: the same clearance
opened costs ``unit(rating)`` degC at each rating, unit being the rating's early loss (or its steady loss where there is
no early one). Since the last restoration, over cycles c (METHOD.md, Wear)::

    loss = K (early (1 - exp(-c / tau)) + steady c),   K = environment * derate factor * the serial's own factor

Everything is increasing and concave in c, so Newton from the left converges monotonically to the crossing.
"""

from __future__ import annotations

import math
from typing import NamedTuple


class WearLaw(NamedTuple):
    """One module at one rating: degC of one unit, early loss in units, its scale (cycles), steady loss in units a cycle
    and an hour, loss never restored in units, fuel share a degC."""

    unit_degC: float
    early: float
    scale_cycles: float
    per_cycle: float
    per_hour: float
    unrecoverable: float
    fuel_frac_per_degC: float


def wear_law(
    *,
    early_loss_degC: float,
    early_scale_cycles: float,
    loss_degC_per_1000_cycles: float,
    loss_degC_per_1000_hours: float,
    unrecoverable_degC: float,
    fuel_frac_per_degC: float,
) -> WearLaw:
    """Return the law of one row of the wear table."""
    unit = early_loss_degC or loss_degC_per_1000_cycles or loss_degC_per_1000_hours or 1.0
    return WearLaw(
        unit,
        early_loss_degC / unit,
        early_scale_cycles,
        loss_degC_per_1000_cycles / 1000.0 / unit,
        loss_degC_per_1000_hours / 1000.0 / unit,
        unrecoverable_degC / unit,
        fuel_frac_per_degC,
    )


def derate_factor(*, reference_frac: float, average_frac: float, wear_frac_per_derate_frac: float) -> float:
    """Return the factor on wear of flying with another derate than the table's (not below a tenth)."""
    return max(0.1, 1.0 + wear_frac_per_derate_frac * (reference_frac - average_frac))


def gained(law: WearLaw, since: float, cycles: float, hours_per_cycle: float) -> float:
    """Return the loss in units, at K = 1, of ``cycles`` more after ``since`` cycles since restoration."""
    early = law.early
    steady = (law.per_cycle + law.per_hour * hours_per_cycle) * cycles
    if early == 0.0:
        return steady
    tau = law.scale_cycles
    return early * (math.exp(-since / tau) - math.exp(-(since + cycles) / tau)) + steady


def integral(law: WearLaw, since: float, cycles: float, hours_per_cycle: float) -> float:
    """Return the integral of ``gained`` over those cycles, in units times cycles."""
    steady = (law.per_cycle + law.per_hour * hours_per_cycle) * cycles * cycles / 2.0
    if law.early == 0.0:
        return steady
    tau = law.scale_cycles
    return law.early * math.exp(-since / tau) * (cycles + tau * math.expm1(-cycles / tau)) + steady


class Slope(NamedTuple):
    """An engine's margin loss ahead: early terms (degC, tau) and a steady loss in degC a cycle."""

    early: tuple[tuple[float, float], ...]
    steady: float

    def loss(self, cycles: float) -> float:
        """Return the loss in degC after so many more cycles."""
        total = self.steady * cycles
        for amount, tau in self.early:
            total -= amount * math.expm1(-cycles / tau)
        return total


def _crossing(slope: Slope, target: float, start: float, wash: tuple[float, float] | None) -> float:
    """Return where loss less the fading gain of the wash at ``start`` meets ``target``; inf if never."""
    early, steady = slope
    x = start
    for _ in range(60):
        value, rate = steady * x, steady
        for amount, tau in early:
            fading = amount * math.exp(-x / tau)
            value += amount - fading
            rate += fading / tau
        if wash is not None:
            gain = wash[0] * math.exp(-(x - start) * wash[1])
            value -= gain
            rate += gain * wash[1]
        gap = target - value
        if gap <= 1e-9:
            return x
        if rate <= 1e-15:
            return math.inf
        x += gap / rate
        if x > 1e9:
            return math.inf
    return x


def cycles_to(
    slope: Slope, margin_degC: float, *, gain_degC: float = 0.0, half_life: float = 1.0, every: int = 0, phase: int = 0
) -> float:
    """Return the first count of cycles at which the loss has used up ``margin_degC`` above the threshold.

    With washes (``every`` > 0; ``phase`` cycles since the last one) the margin has teeth; losses at their ends rise, so
    the tooth is found from the plain crossing and the crossing inside it by Newton. Returns 0 when there is nothing
    left, inf when it is never reached.
    """
    if every <= 0 or gain_degC <= 0.0:
        return 0.0 if margin_degC <= 0.0 else _crossing(slope, margin_degC, 0.0, None)
    decay = math.log(2.0) / half_life
    trough = gain_degC * math.exp(-every * decay)
    now = gain_degC * math.exp(-phase * decay)
    if margin_degC + now <= 0.0:
        return 0.0
    first_end = every - phase
    plain = _crossing(slope, margin_degC + trough, 0.0, None) if margin_degC + trough > 0.0 else 0.0
    if plain == math.inf:
        return math.inf
    if plain <= first_end:
        return _first_tooth(slope, margin_degC, now, decay)
    start = first_end + every * math.floor((plain - first_end) / every)
    if start >= plain:
        start -= every
    return _crossing(slope, margin_degC, float(start), (gain_degC, decay))


def _first_tooth(slope: Slope, margin_degC: float, now: float, decay: float) -> float:
    return _crossing(slope, margin_degC, 0.0, (now, decay))


def wash_gain(*, gain_degC: float, half_life: float, every: int, since: int) -> float:
    """Return the gain left, in degC, ``since`` cycles after the last build (a wash comes with each build)."""
    return gain_degC * math.exp2(-(since % every) / half_life)
