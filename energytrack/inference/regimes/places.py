"""Where a break may lie, in segments: 12.25 is a quarter into the segment that has twelve before it."""

from __future__ import annotations

import datetime as dt
from math import ceil

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference.noise import Array

FEWEST = 12  # segments before a break is looked for
_FEWEST_A_SIDE = 3
_MOST_A_SIDE = 12  # a long log needs no wider margin: the p-value is that of the places really tried
_MOST_IN_PAIRS = 24
_MOST = 200  # places tried at once; all segments of most logs


def margin(count: int, trimming: float) -> int:
    """Segments that a regime has at least."""
    return max(_FEWEST_A_SIDE, min(ceil(trimming * count - 1e-9), _MOST_A_SIDE, count // 2))


def candidates(count: int, shortest: int, taken: tuple[float, ...] = ()) -> Array:
    """Whole places (K,) that leave every regime at least `shortest` segments, evenly thinned in a long log."""
    between = np.arange(shortest, count - shortest + 1, dtype=np.float64)
    for place in taken:
        between = between[np.abs(between - place) >= shortest]
    if len(between) <= _MOST:
        return between
    thinned: Array = between[np.linspace(0, len(between) - 1, _MOST).round().astype(np.intp)]
    return thinned


def pairs(between: Array, shortest: int) -> Array:
    """Pairs (G, 2) of places that leave a regime between them, of at most 24 of the places."""
    thinned = between[np.unique(np.linspace(0, len(between) - 1, _MOST_IN_PAIRS).round().astype(np.intp))]
    first, second = np.triu_indices(len(thinned), 1)
    apart = thinned[second] - thinned[first] >= shortest
    found: Array = np.column_stack([thinned[first[apart]], thinned[second[apart]]])
    return found


def shares(places: Array, count: int) -> Array:
    """Share of each segment that was driven after each place (count, K)."""
    after: Array = np.clip(np.arange(1, count + 1)[:, None] - places, 0.0, 1.0)
    return after


def odometer(observed: Observations, place: float) -> float:
    """Position of a place on the log's own scale, km."""
    return _between(observed.start_km, observed.end_km, place)


def day(observed: Observations, place: float) -> float:
    """Date ordinal of a place."""
    return _between(2 * observed.mid_day - observed.end_day, observed.end_day, place)


def date(observed: Observations, place: float) -> str:
    """Date of a place."""
    return dt.date.fromordinal(round(day(observed, place))).isoformat()


def _between(starts: Array, ends: Array, place: float) -> float:
    """A value along the log; where one segment ends and the next starts apart from it, half-way."""
    segment = int(place)
    inside = place - segment
    if segment >= len(starts):
        return float(ends[-1])
    if inside > 0 or segment == 0:
        return float(starts[segment] + inside * (ends[segment] - starts[segment]))
    return float((ends[segment - 1] + starts[segment]) / 2)
