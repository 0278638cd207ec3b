"""When the modification is on, from now: by number of fill-ups or by date.

Each is a Schedule: it takes the days from now at which the segments ahead end (m,) and gives the share of each driven
with the modification (m,). A segment that spans a switch by date gets its share.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from energytrack.inference.ahead import Schedule
from energytrack.inference.noise import Array

WEEK_DAYS = 7.0


def alternating(every: int) -> Schedule:
    """On for `every` fill-ups, off for as many, and so on."""

    def schedule(ends: Array) -> Array:
        on: Array = (np.arange(len(ends)) // every % 2 == 0).astype(float)
        return on

    return schedule


def off_first(without: int) -> Schedule:
    """More baseline first: off for `without` fill-ups, then on to the end."""

    def schedule(ends: Array) -> Array:
        on: Array = (np.arange(len(ends)) >= without).astype(float)
        return on

    return schedule


def on_off_on(first: int, without: int) -> Schedule:
    """On for `first` fill-ups, off for `without`, then on to the end."""

    def schedule(ends: Array) -> Array:
        place = np.arange(len(ends))
        on: Array = ((place < first) | (place >= first + without)).astype(float)
        return on

    return schedule


def from_day(start: float) -> Schedule:
    """One switch, `start` days from now."""
    return _by_day(lambda day: np.maximum(day - start, 0.0))


def weekly(ends: Array) -> Array:
    """On for a week, off for a week, and so on."""
    return _by_day(lambda day: day // (2 * WEEK_DAYS) * WEEK_DAYS + np.minimum(day % (2 * WEEK_DAYS), WEEK_DAYS))(ends)


def _by_day(days_on: Callable[[Array], Array]) -> Schedule:
    """The schedule that is on for `days_on(day)` of the days up to `day`."""

    def schedule(ends: Array) -> Array:
        starts = np.concatenate([[0.0], ends[:-1]])
        share: Array = (days_on(ends) - days_on(starts)) / (ends - starts)
        return share

    return schedule
