"""A vehicle's month, as plain frozen values. Standard library only.

Percentages are percent of consumption, negative where less is used; distances km; energy in the vehicle's unit, kWh
for one with tank and battery; consumption energy per km. A figure that does not exist is None, never 0 or NaN.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any, Literal

from energytrack.inference.regimes.results import Break
from energytrack.inference.results import Range, SetAside, Verdict, plain


@dataclass(frozen=True)
class Driven:
    """What was driven, used and paid in one month."""

    month: str
    distance_km: float
    measured_km: float  # of that, between known levels
    energy: float | None  # used: consumption as measured, times the whole distance
    consumption: float | None  # as measured
    bought: float  # energy of the entries dated in the month
    cost: float | None  # of those entries; None: none has a cost, or currencies are mixed
    cost_per_km: float | None  # price paid in the month times consumption as measured
    entries: int


@dataclass(frozen=True)
class Level:
    """A month's consumption brought to the reference conditions."""

    month: str
    consumption: float
    interval: Range | None  # None: unbounded
    distance_km: float  # measured


@dataclass(frozen=True)
class Difference:
    """This month against another, at the reference conditions."""

    against: Literal["month-before", "year-ago", "baseline"]
    what: str  # the other month, or what the baseline is
    reference: float  # the other's consumption at the reference conditions
    percent: float
    interval_percent: Range | None
    degrees_of_freedom: float
    measured_percent: float | None  # the difference as measured, with weather and all


@dataclass(frozen=True)
class Carbon:
    """CO2 from one carrier in the month, tank to wheel."""

    carrier: str
    energy: float  # in the carrier's unit
    unit: str
    kg: float | None  # None: no factor
    kg_per_unit: float | None
    source: str | None


@dataclass(frozen=True)
class Price:
    """What energy cost, and how far is driven in a year."""

    currency: str | None
    per_unit: float  # of energy
    consumption: float  # as measured over that time
    yearly_km: float
    yearly_cost: float
    since: str  # date from which both are counted
    scaled: bool  # the log is shorter than a year


@dataclass(frozen=True)
class Worth:
    """What a modification saves in a year, below 0 where it loses, and how far pays it back."""

    yearly: float
    interval: Range | None  # look-proof
    resolved: bool  # the shift is settled
    part_cost: float | None
    payback_km: float | None
    payback_interval_km: tuple[float, float | None] | None  # None: upper end without limit


@dataclass(frozen=True)
class UnderTest:
    """A modification and how its test stands at the end of the month."""

    name: str
    verdict: Verdict
    withheld: bool
    target_percent: float
    shift_percent: float | None
    interval_percent: Range | None
    information_fraction: float | None
    distance_modified_km: float
    distance_to_go_km: float | None
    days_to_go: float | None
    settled_on: str | None
    is_open: bool
    worth: Worth | None


@dataclass(frozen=True)
class RegimeChange:
    """A lasting change of consumption."""

    found: Break
    new: bool  # not found by the end of the month before


@dataclass(frozen=True)
class Quality:
    """How good the month's records are: entries dated in it."""

    entries: int
    partial: int  # tell no level
    missed: int  # have one missing before them
    without_temperature: int  # where the log has temperatures: filled in
    without_speed: int
    without_cost: int  # where the log has costs
    unmeasured_km: float  # driven in the month, of unknown consumption


@dataclass(frozen=True)
class Review:
    """One vehicle's month."""

    vehicle: str
    month: str
    unit: str
    confidence: float
    counted_until: str | None  # the last entry, where the month was not driven to its end by then
    this: Driven
    month_before: Driven | None
    year_ago: Driven | None
    level: Level | None  # at the reference conditions
    level_note: str | None  # what is missing where there is none
    differences: tuple[Difference, ...]
    levels: tuple[Level, ...]  # the last 13 months, oldest first, those that have one
    reference_conditions: dict[str, float]
    carbon: tuple[Carbon, ...]
    price: Price | None
    price_note: str | None  # why there is none
    modifications: tuple[UnderTest, ...]
    regimes: tuple[RegimeChange, ...]  # of the last 12 months
    set_aside: tuple[SetAside, ...]  # of this month
    quality: Quality
    warnings: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}
