"""Consumption at the reference conditions along the odometer, drawn with plain characters."""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil, floor, log10

from energytrack.inference.regimes.results import RegimeReport
from energytrack.logbook.quantities import consumption, consumption_unit
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.regimes.bins import Bin, binned, column
from energytrack.presentation.regimes.marks import Lettered, Mark, lettered
from energytrack.presentation.text import wrap

_ROWS = 13
_LABELLED = 3  # every third row names its consumption
_TICKS = 5  # about so many odometer values


def lines(report: RegimeReport, vehicle: Vehicle, marks: Sequence[Mark], width: int) -> list[str]:
    """The drawing, at most `width` cells wide; [] where there are no points. `vehicle`: whose units are shown."""
    if not report.points:
        return []
    scale = _Scale(report, vehicle)
    names = [scale.name(row) if row % _LABELLED == 0 else "" for row in range(_ROWS)]
    margin = max(map(len, names))
    columns = width - margin - 2
    bins = binned(report.points, columns)
    grid = _grid(report, bins, scale, columns)
    drawn = [f"{name:>{margin}} |{''.join(row)}".rstrip() for name, row in zip(names, grid, strict=True)]
    below = [_axis(scale, columns), _ranges(report, scale, columns), *_letters(lettered(marks), scale, columns)]
    pad = " " * (margin + 1)
    return [
        f"{consumption_unit(vehicle).label} at the log's reference conditions",
        *drawn,
        *(f"{pad}{row}".rstrip() for row in below if row.strip()),
        f"{pad}{_odometer(scale, columns)}".rstrip(),
        *_legend(report, bins, marks, vehicle.distance_unit, width),
    ]


class _Scale:
    """Odometer to columns, consumption to rows from the top."""

    def __init__(self, report: RegimeReport, vehicle: Vehicle) -> None:
        self.vehicle = vehicle
        self.first, self.last = report.points[0].start_km, report.points[-1].end_km
        values = [self.shown(end) for regime in report.regimes for end in regime.interval]
        values += [self.shown(one.consumption) for one in binned(report.points, 60)]
        low, high = min(values), max(values)
        room = (high - low) * 0.04 or abs(high) * 0.01
        self.low, self.high = low - room, high + room

    def shown(self, energy_per_km: float) -> float:
        return consumption(energy_per_km, self.vehicle)

    def row(self, energy_per_km: float) -> int:
        share = (self.high - self.shown(energy_per_km)) / (self.high - self.low)
        return min(max(int(share * _ROWS), 0), _ROWS - 1)

    def name(self, row: int) -> str:
        """Consumption at the middle of a row, with the digits that tell the rows apart."""
        step = (self.high - self.low) / _ROWS
        places = max(0, ceil(-log10(step * _LABELLED)))
        return f"{self.high - (row + 0.5) * step:.{places}f}"

    def column(self, km: float, columns: int) -> int:
        return column(km, self.first, self.last, columns)


def _grid(report: RegimeReport, bins: Sequence[Bin], scale: _Scale, columns: int) -> list[list[str]]:
    """From the bottom layer up: breaks, ranges of regimes, their levels, segments."""
    grid = [[" "] * columns for _ in range(_ROWS)]
    for regime in report.regimes:
        inside = slice(scale.column(regime.start_km, columns), scale.column(regime.end_km, columns) + 1)
        for value in regime.interval:
            _fill(grid[scale.row(value)], inside, "-")
        _fill(grid[scale.row(regime.consumption)], inside, "=")
    for found in report.breaks:
        for row in grid:
            row[scale.column(found.odometer_km, columns)] = "|"
    for one in bins:
        grid[scale.row(one.consumption)][scale.column(one.km, columns)] = "o"
    return grid


def _fill(row: list[str], inside: slice, mark: str) -> None:
    row[inside] = mark * len(row[inside])


def _axis(scale: _Scale, columns: int) -> str:
    cells = ["-"] * columns
    for km in _ticks(scale):
        cells[scale.column(km, columns)] = "+"
    return "+" + "".join(cells)


def _ranges(report: RegimeReport, scale: _Scale, columns: int) -> str:
    """Where each break may lie; only its ends where it is short."""
    cells = [" "] * columns
    for found in report.breaks:
        low, high = (scale.column(end, columns) for end in found.interval_km)
        cells[low : high + 1] = "~" * (high + 1 - low)
        cells[low], cells[high] = "(", ")"
        cells[scale.column(found.odometer_km, columns)] = "|"
    return " " + "".join(cells)


def _letters(marks: Sequence[Lettered], scale: _Scale, columns: int) -> list[str]:
    """Letters below their places; those that would stand on each other one row lower."""
    rows: list[list[str]] = []
    for each in marks:
        at = scale.column(each.mark.km, columns)
        row = next((row for row in rows if row[at] == " "), None)
        if row is None:
            row = [" "] * columns
            rows.append(row)
        row[at] = each.letter
    return [" " + "".join(row) for row in rows]


def _ticks(scale: _Scale) -> list[float]:
    """Round odometer values in the vehicle's unit, returned in km."""
    unit = scale.vehicle.distance_unit
    first, last = (figures.in_unit(km, unit) for km in (scale.first, scale.last))
    rough = (last - first) / _TICKS
    power = 10.0 ** floor(log10(rough))
    step = next(factor * power for factor in (1, 2, 5, 10) if factor * power >= rough)
    per_unit = 1 / figures.in_unit(1.0, unit)
    return [number * step * per_unit for number in range(ceil(first / step), floor(last / step) + 1)]


def _odometer(scale: _Scale, columns: int) -> str:
    """Values below the ticks, centred; one that would touch its neighbour is left out."""
    unit, cells = scale.vehicle.distance_unit, " " * (columns + 1)
    ticks = _ticks(scale)
    for km in ticks:
        text = f"{figures.in_unit(km, unit):,.0f}" + (f" {unit}" if km == ticks[-1] else "")
        start = min(max(scale.column(km, columns) + 1 - len(text) // 2, 0), len(cells) - len(text))
        if not cells[max(start - 1, 0) : start + len(text) + 1].strip():
            cells = cells[:start] + text + cells[start + len(text) :]
    return cells


def _legend(report: RegimeReport, bins: Sequence[Bin], marks: Sequence[Mark], unit: str, width: int) -> list[str]:
    each = len(report.points) / len(bins)
    dot = "o one segment" if each < 1.05 else f"o mean of about {each:.2g} segments"
    between = "; | change, (~~) where it may lie" if report.breaks else ""
    key = [line for one in lettered(marks) for line in wrap(one.said(unit), width, "  ")]
    left_out = len(marks) - len(lettered(marks))
    more = [f"the newest {len(lettered(marks))} of {len(marks)} marks are shown"] if left_out else []
    return [*wrap(f"{dot}; = level of a regime, - its range{between}", width), *key, *more]
