"""Conditions of the driving: a value for each entry, averaged over the distance of each segment."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.terms import TERMS
from energytrack.errors import ConsumptionError, UnknownNameError
from energytrack.logbook.records import Weather

Array = NDArray[np.float64]

OWN_CONDITIONS = ("temperature_c", "speed_kmh")
LEAST_KNOWN_SHARE = 0.5  # of the distance: below it a segment's condition counts as unknown


def entry_conditions(segmented: SegmentedLog, columns: Sequence[str], weather: Sequence[Weather]) -> dict[str, Array]:
    """Temperature, speed and each further column asked for: one value an entry (n_entries,), NaN where unknown.

    Raises UnknownNameError for a column no entry has, ConsumptionError for one that bears the name of a term.
    """
    entries = segmented.entries
    taken = next((column for column in columns if column in TERMS), None)
    if taken is not None:
        raise ConsumptionError(f"{taken!r} is the name of a term of the model: give that column another name")
    values = {
        "temperature_c": _numbers([entry.temperature_c for entry in entries]),
        "speed_kmh": _numbers([entry.speed_kmh for entry in entries]),
    }
    values["speed_kmh"][~(values["speed_kmh"] > 0)] = np.nan
    if weather:
        missing = np.isnan(values["temperature_c"])
        values["temperature_c"][missing] = weather_means(segmented.days, weather)[missing]
    for column in columns:
        if column not in values:
            values[column] = _numbers([entry.extra.get(column) for entry in entries])
            if np.isnan(values[column]).all():
                known = sorted({name for entry in entries for name in entry.extra} | set(OWN_CONDITIONS))
                raise UnknownNameError(f"no entry has a value for {column!r}; there are: {', '.join(known)}")
    return values


def weather_means(days: Sequence[int], weather: Sequence[Weather]) -> Array:
    """Mean temperature of the days from the previous entry to this one, (n_entries,), NaN where no day is known."""
    ends = np.asarray(days, dtype=np.int64)
    starts = np.concatenate([ends[:1], ends[:-1]])
    table = {row.date.toordinal(): row.temperature_c for row in weather if np.isfinite(row.temperature_c)}
    known = np.array(sorted(table), dtype=np.int64)
    sums = np.concatenate([[0.0], np.cumsum([table[day] for day in known.tolist()])])
    low, high = np.searchsorted(known, starts, "left"), np.searchsorted(known, ends, "right")
    means = np.full(len(ends), np.nan)
    np.divide(sums[high] - sums[low], high - low, out=means, where=high > low)
    return means


def distance_means(values: Array, weights: Array, starts: NDArray[np.intp]) -> tuple[Array, Array]:
    """Weighted mean of the known values in each run of legs, and the share of the distance with a known value.

    values, weights: (n_legs,). starts: first leg of each segment (n_segments,). The mean is NaN where less than half
    of the distance is known.
    """
    known = ~np.isnan(values)
    whole = np.add.reduceat(weights, starts)
    covered = np.add.reduceat(weights * known, starts)
    total = np.add.reduceat(np.where(known, values, 0.0) * weights, starts)
    share = covered / whole
    means = np.full(len(starts), np.nan)
    np.divide(total, covered, out=means, where=(share >= LEAST_KNOWN_SHARE) & (covered > 0))
    return means, share


def _numbers(values: Sequence[float | None]) -> Array:
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)
