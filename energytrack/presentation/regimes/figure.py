"""Consumption at the reference conditions along the odometer, as a figure."""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil
from typing import TYPE_CHECKING

from energytrack.errors import ReportError
from energytrack.inference.regimes.results import Regime, RegimeReport
from energytrack.logbook.quantities import consumption, consumption_unit, rounded
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.graphics.canvas import BLACK, BLUE, GREEN, ORANGE, Drawing
from energytrack.presentation.plain import plain_text
from energytrack.presentation.regimes.answer import sentence
from energytrack.presentation.regimes.bins import binned
from energytrack.presentation.regimes.marks import Mark, lettered
from energytrack.presentation.text import HARD_SPACE

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_MOST_DOTS = 300
_LONGEST = 40  # characters of a name in the legend
_ROW, _ROWS = 0.045, 4  # of the axes' height: letters that would stand on each other go one row up
_HEIGHT, _LINE = 4.2, 0.2  # inches, without the legend and of a line in it
_TICKS_PER_INCH = 1.1  # at most, so that long odometer values stay apart
_APART = 0.02  # of the axes' width


def draw(
    report: RegimeReport, vehicle: Vehicle, marks: Sequence[Mark] = (), *, width: float = 8.0, spelled_out: bool = True
) -> Drawing:
    """The drawing of a report; `vehicle`: whose units are shown; `spelled_out`: with a key to the letters of the marks.

    Raises ReportError where there is nothing to draw.
    """
    if not report.points:
        raise ReportError(f"nothing to draw for {plain_text(report.vehicle)}: {plain_text(report.note or 'no points')}")
    legend = 3 + 2 * bool(report.breaks) + (len(lettered(marks)) if spelled_out else 0)
    height = _HEIGHT + _LINE * ceil(legend / 2)
    said = alternative(report, vehicle)
    ticks = int(_TICKS_PER_INCH * width)
    return Drawing(lambda axes: _draw(axes, report, vehicle, marks, ticks, spelled_out), said, height, width)


def alternative(report: RegimeReport, vehicle: Vehicle) -> str:
    """What the drawing shows, in words."""
    levels = "; ".join(_level(regime, vehicle) for regime in report.regimes)
    said = f"Consumption of {plain_text(report.vehicle)} against odometer. {sentence(report, vehicle.distance_unit)} "
    return (said + f"At reference conditions: {levels}.").replace(HARD_SPACE, " ")


def _level(regime: Regime, vehicle: Vehicle) -> str:
    start, end = (figures.driven(km, vehicle.distance_unit) for km in (regime.start_km, regime.end_km))
    figure = f"{rounded(consumption(regime.consumption, vehicle), 3)} {consumption_unit(vehicle).label}"
    return f"{figure} from {start} to {end}"


def _draw(
    axes: Axes, report: RegimeReport, vehicle: Vehicle, marks: Sequence[Mark], ticks: int, spelled_out: bool
) -> None:
    unit = vehicle.distance_unit
    _segments(axes, report, vehicle)
    for number, regime in enumerate(report.regimes):
        place = [figures.in_unit(km, unit) for km in (regime.start_km, regime.end_km)]
        level = consumption(regime.consumption, vehicle)
        low, high = sorted(consumption(end, vehicle) for end in regime.interval)
        sure = f"its {100 * report.confidence:g} % range"
        axes.plot(place, [level, level], color=ORANGE, linewidth=2, label=None if number else "level of a regime")
        axes.fill_between(place, low, high, color=ORANGE, alpha=0.25, linewidth=0, label=None if number else sure)
    for number, found in enumerate(report.breaks):
        low, high = (figures.in_unit(km, unit) for km in found.interval_km)
        at = figures.in_unit(found.odometer_km, unit)
        axes.axvline(at, color=BLACK, linestyle="--", linewidth=1, label=None if number else "change")
        axes.axvspan(low, high, color=BLACK, alpha=0.08, linewidth=0, label=None if number else "where it may lie")
    _marks(axes, marks, unit, spelled_out)
    axes.set_xlabel(f"odometer, {unit}")
    axes.set_ylabel(f"consumption at reference conditions, {consumption_unit(vehicle).label}")
    axes.locator_params(axis="x", nbins=ticks)
    axes.xaxis.set_major_formatter(lambda value, _: f"{value:,.0f}")
    axes.figure.legend(loc="outside lower center", ncols=2, frameon=False, fontsize="small")


def _segments(axes: Axes, report: RegimeReport, vehicle: Vehicle) -> None:
    dots = binned(report.points, _MOST_DOTS if len(report.points) > _MOST_DOTS else 10**6)
    each = len(report.points) / len(dots)
    label = "one segment" if each < 1.05 else f"mean of about {each:.2g} segments"
    place = [figures.in_unit(dot.km, vehicle.distance_unit) for dot in dots]
    axes.plot(place, [consumption(dot.consumption, vehicle) for dot in dots], ".", color=BLUE, alpha=0.7, label=label)


def _marks(axes: Axes, marks: Sequence[Mark], unit: str, spelled_out: bool) -> None:
    """Letters above the drawing, spelled out in the legend unless a key stands elsewhere."""
    left, right = axes.get_xlim()
    last: list[float] = []  # place of the last letter in each row
    for each in lettered(marks):
        at = min(max(figures.in_unit(each.mark.km, unit), left), right)
        row = next((k for k, km in enumerate(last) if at - km > _APART * (right - left)), len(last) % _ROWS)
        last[row : row + 1] = [at]
        what = each.mark.what if len(each.mark.what) <= _LONGEST else each.mark.what[: _LONGEST - 1] + "…"
        label = f"{what}, {figures.driven(each.mark.km, unit)}".replace(HARD_SPACE, " ").replace("$", r"\$")
        axes.plot(
            at, 1.03 + row * _ROW, marker=f"${each.letter}$", color=GREEN, markersize=8, linestyle="none",
            transform=axes.get_xaxis_transform(), clip_on=False, label=label if spelled_out else None,
        )  # fmt: skip
    axes.set_xlim(left, right)
