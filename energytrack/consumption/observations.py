"""Segments as arrays: what the inference sees of a log."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, fields, replace
from itertools import chain
from typing import Any

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.averages import Array, distance_means, entry_conditions
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.shares import fitted_shares, highest_levels, shares
from energytrack.consumption.terms import ELECTRIC
from energytrack.logbook.records import Modification, Weather


@dataclass(frozen=True)
class Observations:
    """Arrays over n segments in driving order; m modifications by name."""

    distance_km: Array  # (n,) true km
    energy: Array  # (n,) used, in `unit`
    mid_day: Array  # (n,) date ordinal of the middle of the segment
    start_km: Array  # (n,) position on the log's own scale
    end_km: Array  # (n,)
    end_day: Array  # (n,) date ordinal
    linked: NDArray[np.bool_]  # (n,) shares its start level with the segment before it
    start_weight: Array  # (n,) sd of the level at each end, relative to a fill to the click-off
    end_weight: Array  # (n,)
    conditions: Mapping[str, Array]  # (n,) distance-weighted; NaN where unknown on more than half of the distance
    known_share: Mapping[str, Array]  # (n,) share of the distance with a known value
    shares: Array  # (n, m) share of the distance with each modification fitted, times level
    fitted: Array  # (n, m) share of the distance with each modification fitted, at whatever level
    levels: Array  # (n, m) highest level, in size, of each modification up to the end of the segment
    names: tuple[str, ...]  # of the modifications, in order of first appearance
    unit: str
    capacity: float | None
    entry: NDArray[np.intp]  # (n,) index of the entry that closes it, in driving order
    confirmed: NDArray[np.bool_]  # (n,) holds an entry whose figures somebody confirmed

    def __len__(self) -> int:
        return len(self.distance_km)

    def head(self, count: int) -> Observations:
        """The first `count` segments, as views: what was known after that many."""
        return self.part(0, count)

    def part(self, start: int, stop: int) -> Observations:
        """Segments `start` to `stop` (exclusive), as views."""
        cut = slice(start, stop)
        shortened = {
            field.name: getattr(self, field.name)[cut]
            for field in fields(self)
            if isinstance(getattr(self, field.name), np.ndarray)
        }
        return replace(
            self,
            **shortened,
            conditions={name: values[cut] for name, values in self.conditions.items()},
            known_share={name: values[cut] for name, values in self.known_share.items()},
        )

    def keeping(self, names: Sequence[str]) -> Observations:
        """Only these modifications; the driving stays as it was."""
        kept = [self.names.index(name) for name in names]
        tables = {table: getattr(self, table)[:, kept] for table in _BY_MODIFICATION}
        return replace(self, **tables, names=tuple(names))

    def leaving_out(self, names: Sequence[str]) -> Observations:
        """All modifications but these."""
        return self.keeping([name for name in self.names if name not in names])

    def adding(self, name: str, shares: Array, fitted: Array | None = None) -> Observations:
        """One more modification: shares (n,) of each segment's distance, times level; on or off without `fitted`."""
        on = shares if fitted is None else fitted
        levels = np.divide(np.abs(shares), on, out=np.zeros(len(shares)), where=on > 0)
        columns = {"shares": shares, "fitted": on, "levels": np.maximum.accumulate(levels)}
        tables: dict[str, Any] = {
            table: np.column_stack([getattr(self, table), column]) for table, column in columns.items()
        }
        return replace(self, **tables, names=(*self.names, name))


_BY_MODIFICATION = ("shares", "fitted", "levels")


def observe(
    segmented: SegmentedLog,
    modifications: Sequence[Modification] = (),
    covariates: Sequence[str] = (),
    weather: Sequence[Weather] = (),
) -> Observations:
    """Arrays over the segments of one vehicle's log.

    modifications: the vehicle's rows, of any names. covariates: further numeric columns to average; temperature and
    speed always are. weather fills in temperatures that entries lack. Raises ConsumptionError for a modification
    without a fitting or overlapping itself, UnknownNameError for a covariate no entry has.
    """
    segments = segmented.segments
    names = tuple(dict.fromkeys(row.name for row in modifications))
    rows = [[row for row in modifications if row.name == name] for name in names]
    conditions, known_share = _conditions(segmented, covariates, weather)
    if segmented.electric:
        electric = np.array(segmented.electric, dtype=np.float64)
        conditions[ELECTRIC] = 100 * electric / _column(segment.distance_km for segment in segments)
        known_share[ELECTRIC] = np.ones(len(segments))
    start_day = _column(segment.start_day for segment in segments)
    end_day = _column(segment.end_day for segment in segments)
    return Observations(
        distance_km=_column(segment.distance_km for segment in segments),
        energy=_column(segment.energy for segment in segments),
        mid_day=(start_day + end_day) / 2,
        start_km=_column(segment.start_km for segment in segments),
        end_km=_column(segment.end_km for segment in segments),
        end_day=end_day,
        linked=np.array([segment.linked for segment in segments], dtype=np.bool_),
        start_weight=_column(segment.start_weight for segment in segments),
        end_weight=_column(segment.end_weight for segment in segments),
        conditions=conditions,
        known_share=known_share,
        shares=_table(shares, segmented, rows),
        fitted=_table(fitted_shares, segmented, rows),
        levels=_table(highest_levels, segmented, rows),
        names=names,
        unit=segmented.unit,
        capacity=segmented.capacity,
        entry=np.array([segment.legs[-1].entry for segment in segments], dtype=np.intp),
        confirmed=_confirmed(segmented),
    )


def _confirmed(segmented: SegmentedLog) -> NDArray[np.bool_]:
    sure = [entry.confirmed for entry in segmented.entries]
    return np.array([any(sure[leg.entry] for leg in segment.legs) for segment in segmented.segments], dtype=np.bool_)


def _conditions(
    segmented: SegmentedLog, covariates: Sequence[str], weather: Sequence[Weather]
) -> tuple[dict[str, Array], dict[str, Array]]:
    by_entry = entry_conditions(segmented, covariates, weather)
    if not segmented.segments:
        nothing = {name: np.empty(0) for name in by_entry}
        return nothing, dict(nothing)
    legs = list(chain.from_iterable(segment.legs for segment in segmented.segments))
    weights = _column(leg.distance_km for leg in legs)
    entry = np.array([leg.entry for leg in legs], dtype=np.intp)
    sizes = np.array([len(segment.legs) for segment in segmented.segments], dtype=np.intp)
    starts = np.concatenate([[0], np.cumsum(sizes)[:-1]]).astype(np.intp)
    means, known = {}, {}
    for name, values in by_entry.items():
        means[name], known[name] = distance_means(values[entry], weights, starts)
    return means, known


def _table(
    measure: Callable[[SegmentedLog, Sequence[Modification]], list[float]],
    segmented: SegmentedLog,
    rows: Sequence[Sequence[Modification]],
) -> Array:
    columns = [measure(segmented, own) for own in rows]
    return np.array(columns, dtype=np.float64).reshape(len(rows), len(segmented.segments)).T


def _column(values: Iterable[float]) -> Array:
    return np.fromiter(values, dtype=np.float64)
