"""The order in which entries were driven, and the rows that contradict it."""

from __future__ import annotations

import datetime as dt
from bisect import bisect_left, bisect_right
from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import Any

from energytrack.logbook.checks import FARTHEST_DAY_KM
from energytrack.logbook.records import Entry, Problem

Row = tuple[int, Entry]


def driving_order(rows: Sequence[Row], file: str = "", *, again: bool = False) -> tuple[list[Row], list[Problem]]:
    """One vehicle's rows in driving order, without those that cannot be true.

    Where every row has an odometer value, date and odometer give the order; else the order of the file does, read from
    the bottom up where it lists the newest first. Of contradicting rows the fewest possible are blamed.
    `again`: several entries at one odometer value are meant.
    """
    if all(entry.odometer_km is not None for _, entry in rows):
        ordered = sorted(rows, key=lambda row: (row[1].date, row[1].odometer_km))
        problems: list[Problem] = []
    else:
        ordered = list(reversed(rows)) if newest_first(rows) else list(rows)
        ordered, problems = _by_date(ordered, file)
    ordered, more = _by_odometer(ordered, file, again)
    return ordered, problems + more


def newest_first(rows: Sequence[Row]) -> bool:
    """Does the file list the newest entry first?"""
    dates = [entry.date for _, entry in rows]
    return sum(a > b for a, b in pairwise(dates)) > sum(a < b for a, b in pairwise(dates))


def _by_date(rows: list[Row], file: str) -> tuple[list[Row], list[Problem]]:
    kept = _rising([entry.date for _, entry in rows], again=True)
    problems = []
    for place in sorted(set(range(len(rows))).difference(kept)):
        line, entry = rows[place]
        around = _around(rows, kept, place, lambda other: str(other.date))
        problems.append(Problem(f"date {entry.date} does not fit {around}; correct it", file, line))
    return [rows[place] for place in kept], problems


def _by_odometer(rows: list[Row], file: str, again: bool) -> tuple[list[Row], list[Problem]]:
    measured = [place for place, (_, entry) in enumerate(rows) if entry.odometer_km is not None]
    rising = _rising([rows[place][1].odometer_km for place in measured], again)
    kept = [measured[index] for index in rising]
    blamed = set(measured).difference(kept)
    problems = []
    for place in sorted(blamed):
        line, entry = rows[place]
        around = _around(rows, kept, place, lambda other: f"{other.odometer_km:.10g} km on {other.date}")
        here = f"odometer {entry.odometer_km:.10g} km on {entry.date}"
        problems.append(Problem(f"{here} does not fit {around}; correct the odometer value or the date", file, line))
    return [row for place, row in enumerate(rows) if place not in blamed], problems


def _around(rows: list[Row], kept: list[int], place: int, say: Callable[[Entry], str]) -> str:
    index = bisect_left(kept, place)
    before = rows[kept[index - 1]] if index else None
    after = rows[kept[index]] if index < len(kept) else None
    words = [f"{word} {say(row[1])} (line {row[0]})" for word, row in (("after", before), ("before", after)) if row]
    return " and ".join(words)


def _rising(values: Sequence[Any], again: bool) -> list[int]:
    """Positions of a longest increasing run (non-decreasing if `again`), O(n log n); Schensted (1961).

    Worked from the end, so that of two runs of one length the later value that goes back is left out.
    """
    find = bisect_right if again else bisect_left
    rank = {value: -place for place, value in enumerate(sorted(set(values)))}
    heads: list[int] = []
    starts: list[int] = []
    following = [-1] * len(values)
    for position in range(len(values) - 1, -1, -1):
        place = find(heads, rank[values[position]])
        following[position] = starts[place - 1] if place else -1
        heads[place : place + 1] = [rank[values[position]]]
        starts[place : place + 1] = [position]
    kept: list[int] = []
    position = starts[-1] if starts else -1
    while position >= 0:
        kept.append(position)
        position = following[position]
    return kept


def misfits(rows: Sequence[Row], standing: Sequence[Entry], file: str = "", *, again: bool = False) -> list[Problem]:
    """Rows that contradict the entries already in the logbook: the odometer must rise with the date."""
    known = [(entry.date, entry.odometer_km) for entry in standing if entry.odometer_km is not None]
    known.sort()
    dates = [date for date, _ in known]
    taken = set(known)
    problems = []
    for line, entry in rows:
        if entry.odometer_km is None:
            continue
        if not again and (entry.date, entry.odometer_km) in taken:
            message = f"the logbook has another entry at {entry.odometer_km:.10g} km on {entry.date}"
            problems.append(Problem(f"{message}; amend that one, or import with --again to keep both", file, line))
            continue
        low = known[bisect_left(dates, entry.date) - 1] if bisect_left(dates, entry.date) else None
        high = known[place] if (place := bisect_right(dates, entry.date)) < len(known) else None
        problems += _beyond(entry, line, file, low, high, again)
    return problems


def jumps(rows: Sequence[Row], standing: Sequence[Entry], file: str = "") -> list[Problem]:
    """Rows farther from the entry before them, here or in the logbook, than any vehicle drives in that time."""
    merged: list[tuple[int | None, Entry]] = [(None, entry) for entry in standing]
    merged += rows
    measured = [row for row in merged if row[1].odometer_km is not None]
    measured.sort(key=lambda row: (row[1].odometer_km, row[1].date))
    problems = []
    for (line, entry), (next_line, after) in pairwise(measured):
        farthest = FARTHEST_DAY_KM * (abs((after.date - entry.date).days) + 1)
        distance = (after.odometer_km or 0) - (entry.odometer_km or 0)
        blamed = next_line if next_line is not None else line
        if distance > farthest and blamed is not None:
            span = f"{distance:.10g} km between {entry.date} and {after.date}"
            message = f"{span} is a jump no vehicle drives; correct odometer or date"
            problems.append(Problem(message, file, blamed))
    return problems


def _beyond(
    entry: Entry,
    line: int,
    file: str,
    low: tuple[dt.date, float] | None,
    high: tuple[dt.date, float] | None,
    again: bool,
) -> list[Problem]:
    assert entry.odometer_km is not None
    here = f"odometer {entry.odometer_km:.10g} km on {entry.date}"
    for word, other, distance in (
        ("after", low, entry.odometer_km - low[1] if low else 1.0),
        ("before", high, high[1] - entry.odometer_km if high else 1.0),
    ):
        if other and (distance < 0 or (distance == 0 and not again)):
            there = f"{word} {other[1]:.10g} km on {other[0]} in the logbook"
            return [Problem(f"{here} does not fit {there}; correct the odometer value or the date", file, line)]
    return []
