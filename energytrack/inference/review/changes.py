"""Lasting changes of consumption found by the end of a month, and which of them are news."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence

from energytrack.consumption.observations import Observations
from energytrack.errors import InferenceError
from energytrack.inference.regimes.breaks import find_breaks
from energytrack.inference.regimes.describe import breaks_of
from energytrack.inference.regimes.find import missing
from energytrack.inference.regimes.results import Break
from energytrack.inference.review.month import Month
from energytrack.inference.review.results import RegimeChange
from energytrack.logbook.records import Event, Modification

_MOST = 5
_MONTHS = 12  # back to which a change is told


def changes(
    observed: Observations,
    month: Month,
    modifications: Sequence[Modification],
    events: Sequence[Event],
    confidence: float,
) -> tuple[RegimeChange, ...]:
    """Of the last 12 months. New: the same search, on the log up to the month before, did not find it.

    A change needs some segments after it to be seen, so what is new in a month often happened before it.
    """
    earliest = dt.date.fromordinal(month.later(1 - _MONTHS).first).isoformat()
    now = [each for each in _breaks(observed, modifications, events, confidence) if each.date >= earliest]
    if not now:
        return ()
    until = int((observed.end_day <= month.later(-1).last).sum())
    then = _breaks(observed.head(until), modifications, events, confidence)
    return tuple(RegimeChange(each, new=not any(_same(each, other) for other in then)) for each in now)


def _breaks(
    observed: Observations, modifications: Sequence[Modification], events: Sequence[Event], confidence: float
) -> tuple[Break, ...]:
    if missing(observed) is not None:
        return ()
    try:
        found = find_breaks(observed, declared=False, max_breaks=_MOST, confidence=confidence)
    except InferenceError:
        return ()
    return breaks_of(found, modifications, events, confidence)


def _same(one: Break, other: Break) -> bool:
    """Their ranges meet, and they point the same way."""
    meet = one.interval_km[0] <= other.interval_km[1] and other.interval_km[0] <= one.interval_km[1]
    return meet and one.shift_percent * other.shift_percent > 0
