"""What was logged about a vehicle, as marks along its odometer, a letter each."""

from __future__ import annotations

import datetime as dt
from bisect import bisect_right
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from string import ascii_uppercase

from energytrack.inference.regimes.results import Match, Point
from energytrack.logbook.records import Event, Modification
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text

MOST = len(ascii_uppercase)


@dataclass(frozen=True)
class Mark:
    """Something fitted, removed or noted, and where on the odometer it stands."""

    what: str
    km: float


@dataclass(frozen=True)
class Lettered:
    """A mark with the letter that stands for it in a drawing."""

    letter: str
    mark: Mark

    def said(self, unit: str) -> str:
        return f"{self.letter} {self.mark.what}, {figures.driven(self.mark.km, unit)}"


def marks_of(
    modifications: Iterable[Modification], events: Iterable[Event], points: Sequence[Point]
) -> tuple[Mark, ...]:
    """Every switch of a modification and every event, in driving order; one known by its day alone is placed by it."""
    switches: list[tuple[str, float | None, dt.date | None]] = []
    for row in modifications:
        switches.append((f"{row.name} fitted", row.fitted_km, row.fitted_date))
        switches.append((f"{row.name} removed", row.removed_km, row.removed_date))
    switches += [(event.what, event.odometer_km, event.date) for event in events]
    placed = [(plain_text(what), _place(km, day, points)) for what, km, day in switches]
    return tuple(sorted((Mark(what, km) for what, km in placed if km is not None), key=lambda mark: mark.km))


def _place(km: float | None, day: dt.date | None, points: Sequence[Point]) -> float | None:
    """The odometer value logged, else about where the vehicle stood on that day."""
    if km is not None or day is None or not points:
        return km
    before = bisect_right(points, day.isoformat(), key=lambda point: point.date)
    return points[0].start_km if before == 0 else points[before - 1].end_km


def lettered(marks: Sequence[Mark]) -> list[Lettered]:
    """Letters from A on; only the newest 26 get one."""
    return [Lettered(letter, mark) for letter, mark in zip(ascii_uppercase, marks[-MOST:], strict=False)]


def named(match: Match) -> str:
    """What was logged, as it is named in a sentence."""
    return plain_text(match.what if match.kind == "event" else f"{match.what} {match.kind}")
