"""Consumption at the reference conditions, month by month, as bars that need no colour."""

from __future__ import annotations

from energytrack.inference.results import Range
from energytrack.inference.review.month import month_of
from energytrack.inference.review.results import Level, Review
from energytrack.logbook.quantities import consumption, consumption_unit, rounded
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.text import wrap

_FEWEST = 2
_MARGIN = 9  # for the month
_BEHIND = 8  # for the figure
_WIDEST = 3.0  # a range counts for the scale as at most so many times the narrowest one's reach


def lines(found: Review, vehicle: Vehicle, width: int) -> list[str]:
    """A row a month, from the first that has a figure on; [] with fewer than two of them."""
    if len(found.levels) < _FEWEST:
        return []
    shown = {level.month: _shown(level, vehicle) for level in found.levels}
    scale = _Scale([*shown.values()], width - _MARGIN - _BEHIND)
    baseline = next((each.reference for each in found.differences if each.against == "baseline"), None)
    mark = None if baseline is None else consumption(baseline, vehicle)
    first = month_of(found.levels[0].month)
    count = 1 + 12 * (month_of(found.month).year - first.year) + month_of(found.month).number - first.number
    rows = [_row(str(first.later(k)), shown, scale, mark) for k in range(count)]
    sure = figures.target(100 * found.confidence)
    legend = f"{consumption_unit(vehicle).label} at reference conditions, month by month: o level, (---) {sure} range"
    legend += "" if mark is None else ", : baseline"
    return [*wrap(legend, width), *rows, " " * _MARGIN + scale.axis()]


class _Scale:
    """A figure to columns."""

    def __init__(self, shown: list[tuple[float, Range]], columns: int) -> None:
        reach = _WIDEST * min(max(abs(value - low), abs(high - value)) for value, (low, high) in shown)
        self.low = min(max(low, value - reach) for value, (low, _) in shown)
        self.high = max(min(high, value + reach) for value, (_, high) in shown)
        if not self.high > self.low:
            self.low, self.high = 0.99 * self.low, 1.01 * self.high
        self.columns = columns

    def column(self, value: float) -> int:
        place = (value - self.low) / (self.high - self.low)
        return round(min(max(place, 0.0), 1.0) * (self.columns - 1))

    def axis(self) -> str:
        low, high = rounded(self.low, 3), rounded(self.high, 3)
        return low + high.rjust(self.columns - len(low))


def _shown(level: Level, vehicle: Vehicle) -> tuple[float, Range]:
    """A level and its range in the vehicle's unit; distance per energy turns the range around."""
    value = consumption(level.consumption, vehicle)
    if level.interval is None or level.interval[0] <= 0:
        return value, (value, value)
    low, high = sorted(consumption(end, vehicle) for end in level.interval)
    return value, (low, high)


def _row(month: str, shown: dict[str, tuple[float, Range]], scale: _Scale, mark: float | None) -> str:
    if month not in shown:
        return f"{month}  nothing measured"
    value, (low, high) = shown[month]
    cells = [" "] * scale.columns
    if mark is not None:
        cells[scale.column(mark)] = ":"
    first, last = scale.column(low), scale.column(high)
    for column in range(first, last + 1):
        cells[column] = "-" if cells[column] == " " else cells[column]
    cells[first] = "<" if low < scale.low else "("
    cells[last] = ">" if high > scale.high else ")"
    cells[scale.column(value)] = "o"
    return f"{month.ljust(_MARGIN)}{''.join(cells)}{rounded(value, 3).rjust(_BEHIND)}"
