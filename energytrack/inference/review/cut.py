"""The log as far as a month is concerned: up to the entry that closes the month's last segment, and nothing later.

So a month reviewed again later gives the same figures, unless entries of that time were corrected.
"""

from __future__ import annotations

import datetime as dt
from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import replace

from energytrack.consumption.segments import SegmentedLog
from energytrack.errors import InferenceError
from energytrack.inference.review.month import Month
from energytrack.logbook.records import Entry, Modification


def entries_until(log: SegmentedLog, month: Month) -> list[Entry]:
    """Entries that say something of the driving up to the month's end, in driving order."""
    crossing = next((each for each in log.segments if each.end_day > month.last and each.start_day <= month.last), None)
    count = bisect_right(log.days, month.last) if crossing is None else crossing.legs[-1].entry + 1
    return list(log.entries[:count])


def fitted_until(rows: Sequence[Modification], entries: Sequence[Entry], month: Month) -> list[Modification]:
    """Modifications fitted by the month's end; one that came off later is still on."""
    reached = max((entry.odometer_km for entry in entries if entry.odometer_km is not None), default=None)
    return [_as_of(row, month) for row in rows if _begun(row, month, reached)]


def _begun(row: Modification, month: Month, reached: float | None) -> bool:
    if row.fitted_date is not None:
        return row.fitted_date.toordinal() <= month.last
    return row.fitted_km is None or reached is None or row.fitted_km < reached


def _as_of(row: Modification, month: Month) -> Modification:
    if row.removed_date is not None and row.removed_date.toordinal() > month.last:
        return replace(row, removed_date=None, removed_km=None)
    return row


def check_month(log: SegmentedLog, month: Month, vehicle: str, today: dt.date) -> None:
    """Raises InferenceError for a month that has not begun, or without any entry."""
    if month.first > today.toordinal():
        raise InferenceError(f"{month} has not begun: today is {today.isoformat()}")
    if any(map(month.holds, log.days)):
        return
    if not log.entries:
        raise InferenceError(f"{vehicle or 'the vehicle'} has no entry yet: log the next full tank or charge")
    days = log.days
    nearest = min(days, key=lambda day: min(abs(day - month.first), abs(day - month.last)))
    near = dt.date.fromordinal(nearest)
    first, last = (dt.date.fromordinal(day).isoformat() for day in (min(days), max(days)))
    raise InferenceError(
        f"{vehicle or 'the vehicle'} has no entry in {month}: its entries run from {first} to {last}; "
        f"the nearest month with one is {near.isoformat()[:7]}"
    )
