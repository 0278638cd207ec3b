"""The share of each segment's distance that was driven with a modification fitted."""

from __future__ import annotations

import math
from bisect import bisect_left, bisect_right
from collections.abc import Sequence
from dataclasses import replace
from datetime import date
from itertools import accumulate, pairwise

from energytrack.consumption.positions import position_on
from energytrack.consumption.segments import Leg, SegmentedLog
from energytrack.errors import ConsumptionError
from energytrack.logbook.records import Modification

Period = tuple[float, float, float]  # fitted at, removed at (positions, inf while still on), level


def fitted_position(segmented: SegmentedLog, day: date | None, km: float | None) -> float | None:
    """Position of a switch on the log's own scale; km decides where both are given, None where neither is.

    On the date of an entry it is that entry's position (switched right after it), between entries it is interpolated.
    """
    if km is not None:
        return km
    if day is None:
        return None
    return position_on(segmented.positions, segmented.days, day) if segmented.entries else 0.0


def fitted_periods(segmented: SegmentedLog, modifications: Sequence[Modification]) -> list[Period]:
    """Periods of one modification in order of position; level 1 where none is given.

    Raises ConsumptionError for a row without a fitting, removed before fitted, or overlapping another row.
    """
    periods = sorted(_period(segmented, row) for row in modifications)
    for (_, removed, _), (fitted, _, _) in pairwise(periods):
        if fitted < removed:
            name = modifications[0].name
            raise ConsumptionError(
                f"modification {name!r} is fitted at {fitted:,.0f} km while it is still on; note first when it came off"
            )
    return periods


def shares(segmented: SegmentedLog, modifications: Sequence[Modification]) -> list[float]:
    """For each segment the share of its distance with the modification fitted, times its level where one is given.

    modifications: the rows of one name. Raises ConsumptionError as fitted_periods does.
    """
    fitted = _Fitted(fitted_periods(segmented, modifications))
    return [
        math.fsum(leg.distance_km * fitted.share(leg) for leg in segment.legs) / segment.distance_km
        for segment in segmented.segments
    ]


def fitted_shares(segmented: SegmentedLog, modifications: Sequence[Modification]) -> list[float]:
    """As shares, but at whatever level; a row at level 0 counts as not fitted."""
    return shares(segmented, [replace(row, level=0.0 if row.level == 0 else 1.0) for row in modifications])


def highest_levels(segmented: SegmentedLog, modifications: Sequence[Modification]) -> list[float]:
    """For each segment the highest level, in size, driven with up to its end; 0 before the first fitting."""
    periods = [period for period in fitted_periods(segmented, modifications) if period[0] < period[1]]
    starts = [fitted for fitted, _, _ in periods]
    ends = [removed for _, removed, _ in periods]
    highest, levels = 0.0, []
    for segment in segmented.segments:
        touching = periods[bisect_right(ends, segment.start_km) : bisect_left(starts, segment.end_km)]
        highest = max([highest, *(abs(level) for _, _, level in touching)])
        levels.append(highest)
    return levels


class _Fitted:
    """Answers for any leg in logarithmic time: the distance fitted (times level) up to each switch is added up once."""

    def __init__(self, periods: Sequence[Period]) -> None:
        self.periods = periods
        self.starts = [fitted for fitted, _, _ in periods]
        whole = [(removed - fitted) * level if removed < math.inf else 0.0 for fitted, removed, level in periods]
        self.before = [0.0, *accumulate(whole)]

    def share(self, leg: Leg) -> float:
        first, last = bisect_right(self.starts, leg.start_km), bisect_right(self.starts, leg.end_km)
        if first == last:  # at most one period touches the leg: no sums that could lose digits
            return self._within(leg, first - 1) if first else 0.0
        return (self._until(leg.end_km) - self._until(leg.start_km)) / (leg.end_km - leg.start_km)

    def _within(self, leg: Leg, index: int) -> float:
        _, removed, level = self.periods[index]
        if removed >= leg.end_km and removed > leg.start_km:
            return level
        if removed <= leg.start_km:
            return 0.0
        return level * (removed - leg.start_km) / (leg.end_km - leg.start_km)

    def _until(self, position: float) -> float:
        index = bisect_right(self.starts, position) - 1
        if index < 0:
            return 0.0
        fitted, removed, level = self.periods[index]
        return self.before[index] + (min(position, removed) - fitted) * level


def _period(segmented: SegmentedLog, row: Modification) -> Period:
    fitted = fitted_position(segmented, row.fitted_date, row.fitted_km)
    if fitted is None:
        raise ConsumptionError(f"modification {row.name!r} has neither a fitting date nor km; note one of them")
    removed = fitted_position(segmented, row.removed_date, row.removed_km)
    if removed is not None and removed < fitted:
        raise ConsumptionError(
            f"modification {row.name!r} is removed at {removed:,.0f} km, before it is fitted at {fitted:,.0f} km; "
            "correct one of the two"
        )
    return fitted, math.inf if removed is None else removed, 1.0 if row.level is None else row.level
