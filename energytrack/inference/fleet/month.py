"""A calendar month, as written and as days. Standard library only."""

from __future__ import annotations

import datetime as dt
import re
from dataclasses import dataclass

from energytrack.errors import InferenceError


@dataclass(frozen=True)
class Month:
    """first and last: date ordinals."""

    name: str
    first: int
    last: int

    def holds(self, day: dt.date) -> bool:
        return self.first <= day.toordinal() <= self.last


def month_of(written: str) -> Month:
    """A month written YYYY-MM. Raises InferenceError for anything else."""
    found = re.fullmatch(r"(\d{4})-(\d{2})", written.strip(), re.ASCII)
    if found is None or not 1 <= int(found[2]) <= 12 or int(found[1]) < 1:
        raise InferenceError(f"{written!r} is no month: write it as in 2026-11")
    year, month = int(found[1]), int(found[2])
    following = dt.date(year + month // 12, month % 12 + 1, 1) if year < 9999 else dt.date.max
    return Month(f"{year:04d}-{month:02d}", dt.date(year, month, 1).toordinal(), following.toordinal() - 1)


def month_with(day: dt.date) -> Month:
    """The month of a day."""
    return month_of(f"{day.year:04d}-{day.month:02d}")
