"""A log of any length as so many points along the odometer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from energytrack.inference.regimes.results import Point


@dataclass(frozen=True)
class Bin:
    """Neighbouring segments as one: their middle, km, and mean consumption, energy per km."""

    km: float
    consumption: float
    segments: int


def binned(points: Sequence[Point], count: int) -> list[Bin]:
    """Means over at most `count` equal stretches of the odometer, weighted by distance; empty ones are left out."""
    first, last = points[0].start_km, points[-1].end_km
    stretches: dict[int, list[Point]] = {}
    for point in points:
        middle = (point.start_km + point.end_km) / 2
        stretches.setdefault(column(middle, first, last, count), []).append(point)
    return [_mean(inside) for _, inside in sorted(stretches.items())]


def column(km: float, first: float, last: float, count: int) -> int:
    """Which of `count` equal stretches from `first` to `last` a place lies in; the nearest one if outside."""
    share = (km - first) / (last - first) if last > first else 0.0
    return min(max(int(share * count), 0), count - 1)


def _mean(points: Sequence[Point]) -> Bin:
    lengths = [point.end_km - point.start_km for point in points]
    energy = sum(point.consumption * km for point, km in zip(points, lengths, strict=True))
    return Bin((points[0].start_km + points[-1].end_km) / 2, energy / sum(lengths), len(points))
