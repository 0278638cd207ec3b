"""How figures are written: with a unit, a range, and only the digits they deserve."""

from __future__ import annotations

import math

from energytrack.inference.results import Range
from energytrack.logbook.quantities import DISTANCE
from energytrack.presentation.text import join

_WIDE = 0.3  # of a distance: half the width of its range, from which on a third digit would say nothing
OPEN_PERCENT = 100.0  # a range this wide is called open


def exists(value: float | None) -> bool:
    """Whether a figure is there at all."""
    return value is not None and math.isfinite(value)


def in_unit(km: float, unit: str) -> float:
    """A distance or speed in km (km/h) as km or mi (mi/h)."""
    return km / DISTANCE[unit]


def significant(value: float, digits: int) -> str:
    """A number to so many significant digits, thousands separated; never shown finer than whole."""
    if value == 0:
        return "0"
    place = max(0, math.floor(math.log10(abs(value))) + 1 - digits)
    return f"{round(value, -place):,.0f}"


def distance(km: float, unit: str, digits: int = 3) -> str:
    """A distance that was computed: three significant digits from 1,000 on, two below."""
    shown = in_unit(km, unit)
    return join(f"{significant(shown, digits if shown >= 1000 else 2)} {unit}")


def foretold(km: float, interval: tuple[float, float | None] | None, unit: str) -> str:
    """A distance that lies ahead: two significant digits where its range is wide, unknown or without an end."""
    sure = interval is not None and interval[1] is not None and interval[1] - interval[0] <= 2 * _WIDE * km
    return distance(km, unit, 3 if sure else 2)


def driven(km: float, unit: str) -> str:
    """A distance that was read off: to the whole unit."""
    return join(f"{in_unit(km, unit):,.0f} {unit}")


def distance_range(low: float, high: float | None, unit: str) -> str:
    """A range of computed distances, two significant digits."""
    first = significant(in_unit(low, unit), 2)
    if high is None:
        return join(f"{first} {unit}") + " or more, no upper end in sight"
    return join(f"{first} to {significant(in_unit(high, unit), 2)} {unit}")


def days(count: float) -> str:
    """Whole days, two significant digits from 100 on."""
    if count < 1:
        return join("1 day")
    whole = round(count)
    return join(f"{whole} day" if whole == 1 else f"{significant(whole, 2)} days")


def _decimals(standard_error: float | None) -> int:
    if standard_error is None or not math.isfinite(standard_error):
        return 1
    return 2 if standard_error < 0.1 else 0 if standard_error >= 10 else 1


def bare(value: float, standard_error: float | None = None, *, signed: bool = False) -> str:
    """The number of a percentage: one decimal, two where the standard error is below 0.1, none from 10 on."""
    places = _decimals(standard_error)
    rounded = round(value, places) + 0.0
    if rounded == 0:
        rounded = 0.0
    return f"{rounded:+.{places}f}" if signed and rounded else f"{rounded:.{places}f}"


def percent(value: float, standard_error: float | None = None, *, signed: bool = False) -> str:
    """A percentage with its unit."""
    return join(f"{bare(value, standard_error, signed=signed)} %")


def percent_range(span: Range, standard_error: float | None = None, *, signed: bool = True) -> str:
    """A range of percentages, low to high; whole ones where it is as wide as 20."""
    error = max(standard_error or 0.0, 10.0) if span[1] - span[0] >= 20 else standard_error
    low, high = (bare(value, error, signed=signed) for value in span)
    return join(f"{low} to {high} %")


def target(value: float) -> str:
    """The target as it was asked for."""
    return join(f"{value:g} %")


def bounded(span: Range | None) -> Range | None:
    """The range, or None where it has no ends worth showing: wider than all of consumption tells nothing."""
    return span if span is not None and span[1] - span[0] < OPEN_PERCENT else None
