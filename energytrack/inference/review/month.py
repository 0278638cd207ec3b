"""A calendar month, as written and as days. Standard library only.

A day's entry stands in the middle of its day: driving between two entries is spread evenly from noon to noon.
"""

from __future__ import annotations

import datetime as dt
import re
from dataclasses import dataclass
from functools import cached_property

from energytrack.errors import InferenceError


@dataclass(frozen=True, order=True)
class Month:
    """Of a year; ordered by time."""

    year: int
    number: int  # 1 to 12

    def __str__(self) -> str:
        return f"{self.year:04d}-{self.number:02d}"

    @cached_property
    def first(self) -> int:
        """Date ordinal of its first day."""
        return dt.date(self.year, self.number, 1).toordinal()

    @cached_property
    def last(self) -> int:
        """Date ordinal of its last day."""
        return self.later(1).first - 1

    def later(self, months: int) -> Month:
        """So many months later, or earlier where negative."""
        year, month = divmod(12 * self.year + self.number - 1 + months, 12)
        return Month(year, month + 1)

    def holds(self, day: int) -> bool:
        """Whether a day (ordinal) lies in it."""
        return self.first <= day <= self.last

    def share(self, start_day: int, end_day: int) -> float:
        """Share of the driving between entries of two days (ordinals) that falls into this month."""
        if start_day >= end_day:
            return 1.0 if self.holds(end_day) else 0.0
        if end_day < self.first or start_day > self.last:
            return 0.0
        start, end = start_day + 0.5, end_day + 0.5
        inside = min(end, self.last + 1.0) - max(start, float(self.first))
        return max(0.0, inside) / (end - start)


def month_of(written: str) -> Month:
    """A month written YYYY-MM. Raises InferenceError for anything else."""
    found = re.fullmatch(r"(\d{4})-(\d{2})", written.strip(), re.ASCII)
    if found is None or not 1 <= int(found[2]) <= 12 or not 2 <= int(found[1]) <= 9998:
        raise InferenceError(f"{written!r} is no month: write it as YYYY-MM, such as 2026-11")
    return Month(int(found[1]), int(found[2]))


def month_with(day: dt.date) -> Month:
    """The month of a day."""
    return Month(day.year, day.month)
