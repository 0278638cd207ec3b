"""How good a month's records are."""

from __future__ import annotations

from collections.abc import Sequence

from energytrack.consumption.segments import SegmentedLog
from energytrack.inference.review.month import Month
from energytrack.inference.review.results import Driven, Quality
from energytrack.logbook.records import Entry, Weather


def quality_of(log: SegmentedLog, month: Month, this: Driven, weather: Sequence[Weather]) -> Quality:
    """Counts over the entries dated in the month. A condition counts as lacking where the log usually has it."""
    own = [entry for entry, day in zip(log.entries, log.days, strict=True) if month.holds(day)]
    days = {row.date for row in weather}
    temperatures = [entry for entry in log.entries if entry.temperature_c is not None]
    speeds = [entry for entry in log.entries if entry.speed_kmh is not None]
    costs = [entry for entry in log.entries if entry.cost is not None]
    return Quality(
        entries=len(own),
        partial=sum(not entry.full and entry.level_percent is None for entry in own),
        missed=sum(entry.missed for entry in own),
        without_temperature=_usual(temperatures, log)
        * sum(entry.temperature_c is None and entry.date not in days for entry in own),
        without_speed=_usual(speeds, log) * sum(entry.speed_kmh is None for entry in own),
        without_cost=_usual(costs, log) * sum(entry.cost is None for entry in own),
        unmeasured_km=max(0.0, this.distance_km - this.measured_km),
    )


def _usual(having: Sequence[Entry], log: SegmentedLog) -> bool:
    return 2 * len(having) >= len(log.entries)
