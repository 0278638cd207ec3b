"""Short ways to write a log down in a test."""

from __future__ import annotations

import datetime as dt
from typing import Any

from energytrack.logbook.records import Entry, Event, Modification

FIRST = dt.date(2026, 1, 1)


def day(number: int) -> dt.date:
    """The day `number` days after the first of January 2026."""
    return FIRST + dt.timedelta(days=number)


def fill(number: int, odometer: float | None, energy: float, **more: Any) -> Entry:
    """A fill-up on a day."""
    return Entry("van", day(number), energy, odometer, **more)


def fitted(km: float | None = None, until: float | None = None, **more: Any) -> Modification:
    """A period of one modification, by position."""
    return Modification("van", "skirts", fitted_km=km, removed_km=until, **more)


def tyres(factor: float, km: float | None, number: int = 0) -> Event:
    """Tyres of another circumference from here on."""
    return Event("van", day(number), "tyres", km, factor)
