"""Where and when the vehicle stood at each entry: driving order, one distance scale, days that never run backwards."""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Sequence
from datetime import date
from itertools import pairwise

from energytrack.logbook.records import Entry, Problem


def driving_order(entries: Sequence[Entry]) -> list[Entry]:
    """Entries as driven: by odometer among those that have one; by date, then as given, for the others."""
    by_date = sorted(entries, key=lambda entry: entry.date)
    slots = [index for index, entry in enumerate(by_date) if entry.odometer_km is not None]
    by_odometer = sorted((by_date[index] for index in slots), key=lambda entry: entry.odometer_km or 0.0)
    for slot, entry in zip(slots, by_odometer, strict=True):
        by_date[slot] = entry
    return by_date


def known_distance(entry: Entry) -> float | None:
    """The distance noted with an entry, None where there is none that could be meant."""
    distance = entry.distance_km
    return distance if distance is not None and 0 <= distance < math.inf else None


def scale_positions(ordered: Sequence[Entry]) -> list[float]:
    """Position of each entry in km: its odometer where noted, continued from there by distance in both directions.

    Without any odometer, distances are added up from 0. Unknown distances add nothing. Never decreasing.
    """
    count = len(ordered)
    steps = [known_distance(entry) or 0.0 for entry in ordered]
    first = next((index for index, entry in enumerate(ordered) if entry.odometer_km is not None), None)
    positions = [0.0] * count
    reached = 0.0
    for index, entry in enumerate(ordered):
        reached = reached + steps[index] if entry.odometer_km is None else entry.odometer_km
        positions[index] = reached
    for index in range((first or 0) - 1, -1, -1):
        positions[index] = positions[index + 1] - steps[index + 1]
    ceiling = math.inf  # distances noted between two odometer values may add up to more than lies between them
    for index in range(count - 1, -1, -1):
        ceiling = positions[index] = min(positions[index], ceiling)
    return positions


def monotone_days(ordered: Sequence[Entry]) -> tuple[list[int], list[Problem]]:
    """Day of each entry as an ordinal, and a problem for each date that contradicts the odometer.

    Such a date is replaced by the one before it that fits (longest non-decreasing run of dates, Schensted 1961).
    """
    days = [entry.date.toordinal() for entry in ordered]
    if all(before <= after for before, after in pairwise(days)):
        return days, []
    fitting = _longest_rising(days)
    problems = []
    carried = days[min(fitting)]
    for index, entry in enumerate(ordered):
        if index in fitting:
            carried = days[index]
        else:
            where = "" if entry.odometer_km is None else f" at {entry.odometer_km:,.0f} km"
            problems.append(Problem(f"the entry of {entry.date}{where} has a date that contradicts the odometer order"))
            days[index] = carried
    return days, problems


def _longest_rising(days: Sequence[int]) -> set[int]:
    tails: list[int] = []  # smallest last day of a rising run of each length
    ends: list[int] = []  # the index where that run ends
    before = [-1] * len(days)
    for index, day in enumerate(days):
        length = bisect_right(tails, day)
        before[index] = ends[length - 1] if length else -1
        tails[length : length + 1] = [day]
        ends[length : length + 1] = [index]
    chosen = set()
    index = ends[-1]
    while index >= 0:
        chosen.add(index)
        index = before[index]
    return chosen


def position_on(positions: Sequence[float], days: Sequence[int], day: date) -> float:
    """Position on a date: that of the (last) entry of that date, else interpolated between its neighbours.

    Before the first and after the last entry the position is theirs.
    """
    ordinal = day.toordinal()
    after = bisect_right(days, ordinal)
    if after == 0:
        return positions[0]
    if after == len(days) or days[after - 1] == ordinal:
        return positions[after - 1]
    part = (ordinal - days[after - 1]) / (days[after] - days[after - 1])
    return positions[after - 1] + part * (positions[after] - positions[after - 1])
