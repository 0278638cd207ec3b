"""What was found out about regimes, as plain frozen values. Standard library only.

Percentages are percent of consumption, negative where less is used; distances km; consumption energy per km.
A figure that does not exist is None, never 0 or NaN.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any, Literal

from energytrack.inference.results import Range, plain


@dataclass(frozen=True)
class Match:
    """Something that was logged and lies inside a break's range."""

    what: str  # the modification's name, or the event
    kind: Literal["fitted", "removed", "event"]
    odometer_km: float | None
    date: str | None


@dataclass(frozen=True)
class Break:
    """A change of consumption that lasts: where, when, how large, and what was logged there."""

    odometer_km: float
    date: str
    interval_km: Range
    interval_dates: tuple[str, str]
    shift_percent: float  # of the consumption just before it
    interval_percent: Range | None
    p_value: float  # of the test that found it
    explained_by: str | None  # what was logged nearest to it, None: nothing inside its range
    matches: tuple[Match, ...]  # all that was logged inside its range, nearest first
    explanation: str  # in words
    suspects: tuple[str, ...]  # where to look, for an unexplained one; not a diagnosis
    caution: str | None


@dataclass(frozen=True)
class Regime:
    """A stretch without a break, and its consumption at the reference conditions of the log."""

    start_km: float
    end_km: float
    start_date: str
    end_date: str
    segments: int
    consumption: float
    interval: Range


@dataclass(frozen=True)
class BreakTest:
    """A test for one or two breaks more than those before."""

    breaks: int  # given
    more: int
    statistic: float
    p_value: float


@dataclass(frozen=True)
class Criterion:
    """How well a number of breaks fits, less what its parameters cost; the smallest is best."""

    breaks: int
    residual: float  # generalised residual sum of squares
    bic: float
    lwz: float


@dataclass(frozen=True)
class Point:
    """One segment, its consumption brought to the reference conditions."""

    start_km: float
    end_km: float
    date: str
    consumption: float


@dataclass(frozen=True)
class RegimeReport:
    """Whether and where consumption changed, whatever was declared."""

    vehicle: str
    unit: str
    confidence: float
    statistic: float | None  # sup-F: the largest Wald statistic for a single break
    p_value: float | None  # of that test, or of the one for two at once where only that one found any
    p_value_asymptotic: float | None  # of the statistic, for a long series with independent errors
    decided_by: str | None
    breaks: tuple[Break, ...]
    regimes: tuple[Regime, ...]
    tests: tuple[BreakTest, ...]
    criteria: tuple[Criterion, ...]
    points: tuple[Point, ...]
    judged_km: Range | None  # a break before or after cannot be told yet
    later_km: float | None  # to drive until a change at the end of the log could be told
    note: str | None  # what is missing, where nothing could be looked for
    warnings: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}
