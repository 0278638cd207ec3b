"""Consumption against temperature or speed: segments with everything else at the reference, and the fitted curve."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from energytrack.inference.report.results import Curve, Dot
from energytrack.logbook.quantities import consumption, consumption_text, consumption_unit
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.graphics.canvas import BLUE, NARROW, ORANGE, Drawing
from energytrack.presentation.plain import plain_text
from energytrack.presentation.regimes.bins import column
from energytrack.presentation.text import HARD_SPACE

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_MOST_DOTS = 300
NAMES = {"temperature_c": "temperature", "speed_kmh": "speed"}


def draw(curve: Curve, vehicle: Vehicle) -> Drawing:
    """The drawing of a curve; `vehicle`: whose units are shown."""
    return Drawing(lambda axes: _draw(axes, curve, vehicle), alternative(curve, vehicle), 3.6, NARROW)


def alternative(curve: Curve, vehicle: Vehicle) -> str:
    """What the drawing shows, in words."""
    ends = []
    for step in (curve.steps[0], curve.steps[-1]):
        low, high = (consumption_text(end, vehicle) for end in (step.low, step.high))
        value = f"{_scale(curve, vehicle)(step.value):.0f} {_unit(curve, vehicle)}"
        ends.append(f"{consumption_text(step.consumption, vehicle)} at {value} (range {low} to {high})")
    return (
        f"Consumption of {plain_text(vehicle.name)} against {NAMES[curve.condition]}, the rest at "
        f"reference conditions, {len(curve.dots)} segments. By the fitted curve {' and '.join(ends)}."
    )


def _draw(axes: Axes, curve: Curve, vehicle: Vehicle) -> None:
    dots, scale = binned(curve.dots), _scale(curve, vehicle)
    each = len(curve.dots) / len(dots)
    label = "one segment" if each < 1.05 else f"mean of about {each:.2g} segments"
    shown = [consumption(dot.consumption, vehicle) for dot in dots]
    axes.plot([scale(dot.value) for dot in dots], shown, ".", color=BLUE, alpha=0.7, label=label)
    place = [scale(step.value) for step in curve.steps]
    low, high = ([consumption(end, vehicle) for end in ends] for ends in zip(*_ranges(curve), strict=True))
    sure = figures.target(100 * curve.confidence).replace(HARD_SPACE, " ")
    axes.fill_between(place, low, high, color=ORANGE, alpha=0.25, linewidth=0, label=f"its {sure} range")
    fitted = [consumption(step.consumption, vehicle) for step in curve.steps]
    axes.plot(place, fitted, color=ORANGE, linewidth=2, label="fitted curve")
    axes.set_xlabel(f"{'mean ' if curve.condition == 'speed_kmh' else ''}{_axis(curve, vehicle)}")
    axes.set_ylabel(f"consumption, {consumption_unit(vehicle).label}")
    axes.figure.legend(loc="outside lower center", ncols=2, frameon=False, fontsize="small")


def binned(dots: tuple[Dot, ...], count: int = _MOST_DOTS) -> list[Dot]:
    """As they are, or of more than `count` the means by distance over so many equal stretches of the condition."""
    if len(dots) <= count:
        return list(dots)
    first, last = min(dot.value for dot in dots), max(dot.value for dot in dots)
    stretches: dict[int, list[Dot]] = {}
    for dot in dots:
        stretches.setdefault(column(dot.value, first, last, count), []).append(dot)
    return [_mean(inside) for _, inside in sorted(stretches.items())]


def _mean(dots: list[Dot]) -> Dot:
    total = sum(dot.distance_km for dot in dots)
    value = sum(dot.value * dot.distance_km for dot in dots) / total
    return Dot(value, sum(dot.consumption * dot.distance_km for dot in dots) / total, total)


def _ranges(curve: Curve) -> list[tuple[float, float]]:
    return [(step.low, step.high) for step in curve.steps]


def _axis(curve: Curve, vehicle: Vehicle) -> str:
    return f"{NAMES[curve.condition]}, {_unit(curve, vehicle)}"


def _unit(curve: Curve, vehicle: Vehicle) -> str:
    return "°C" if curve.condition == "temperature_c" else f"{vehicle.distance_unit}/h"


def _scale(curve: Curve, vehicle: Vehicle) -> Callable[[float], float]:
    """From the condition's own unit to the one shown."""
    if curve.condition == "temperature_c":
        return float
    return lambda kmh: figures.in_unit(kmh, vehicle.distance_unit)
