"""Events that came with the modification: whatever they did, the log ascribes to it."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence

from energytrack.logbook.records import Event, Modification

NEAR_DAYS, NEAR_KM = 14, 1_000.0  # a tank or two: nothing was driven in between that could tell them apart


def coincidences(events: Sequence[Event], modifications: Sequence[Modification], name: str) -> tuple[str, ...]:
    """A sentence for each event near a fitting or removal of this modification.

    Tyres of another circumference count as well: the factor mends the odometer, not the tyres' own resistance.
    """
    return tuple(
        f"{event.what} ({event.date}) came with {name}: whatever it did is counted as the modification's. "
        f"Take one of the two back for some full tanks, or test again where only one changes"
        for event in events
        if coincident(event, modifications, name)
    )


def coincident(event: Event, modifications: Sequence[Modification], name: str) -> bool:
    """Whether an event lies near a fitting or removal of this modification."""
    return any(
        _near(event, date, km)
        for row in modifications
        if row.name == name
        for date, km in ((row.fitted_date, row.fitted_km), (row.removed_date, row.removed_km))
    )


def _near(event: Event, date: dt.date | None, km: float | None) -> bool:
    if km is not None and event.odometer_km is not None:
        return abs(event.odometer_km - km) <= NEAR_KM
    return date is not None and abs((event.date - date).days) <= NEAR_DAYS
