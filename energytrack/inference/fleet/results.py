"""What a fleet answers, as plain frozen values. Standard library only.

Percentages are percent of consumption; negative shifts are savings. A figure that does not exist is None.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

from energytrack.inference.results import Look, Range, Verdict, plain


@dataclass(frozen=True)
class Milestone:
    """A point on a vehicle's own road ahead, and what would be known of its shift there."""

    distance_km: float  # from now, with the modification fitted
    days: float
    variance: float  # of the shift as a ratio


@dataclass(frozen=True)
class BriefAnswer:
    """One modification of one vehicle: the verdict and figures of `assess`, and no more than a row needs."""

    modification: str
    verdict: Verdict
    target_percent: float
    shift_percent: float | None
    interval_percent: Range | None  # look-proof
    standard_error_percent: float | None
    degrees_of_freedom: float | None
    information_fraction: float | None
    distance_modified_km: float
    distance_to_go_km: float | None
    days_to_go: float | None
    never_apart: tuple[str, ...] = ()  # this answer is for these as well
    ahead: tuple[Milestone, ...] = ()  # the first one is now
    withheld: bool = False  # a shift was found, but a change that nothing logged explains lies inside the test


@dataclass(frozen=True)
class Deviation:
    """A month's consumption against what the vehicle's own record expects of that month's driving."""

    measured: float  # energy per km
    expected: float  # energy per km, at that month's conditions and with the parts then fitted
    deviation_percent: float
    standard_error_percent: float
    degrees_of_freedom: float
    z: float  # deviation in standard errors, drift and levels counted
    p_value: float


@dataclass(frozen=True)
class VehicleReview:
    """One vehicle in a month. `message` says why there is no answer; the fleet goes on without it."""

    vehicle: str
    unit: str
    distance_km: float = 0.0  # driven in the month, of known consumption or not
    energy: float = 0.0  # consumption as measured times that distance; 0 where nothing is measured
    deviation: Deviation | None = None
    why_none: str = ""  # no deviation: what is missing
    adjusted_p: float | None = None  # Benjamini and Hochberg (1995), over the vehicles of the fleet
    attention: bool = False  # adjusted_p is at most the false discovery rate asked for
    odd_segments: int = 0  # of the month, that stand out from their neighbours: a slip of the pen, or what happened
    answers: tuple[BriefAnswer, ...] = ()
    message: str = ""


@dataclass(frozen=True)
class Contribution:
    """One vehicle's part in a pooled shift."""

    vehicle: str
    shift_percent: float
    standard_error_percent: float
    weight_percent: float
    gain_percent: float | None  # of the pooled information, by this vehicle's next 1,000 km; None: no road ahead


@dataclass(frozen=True)
class Heterogeneity:
    """How much the vehicles differ beyond their own errors."""

    q: float  # Cochran's (1954)
    p_value: float
    i_squared_percent: float
    between_percent: float  # sd between vehicles, of the shift in percent


@dataclass(frozen=True)
class PooledShift:
    """One modification over the vehicles that have it: random effects, looked at once."""

    modification: str
    vehicles: tuple[Contribution, ...]  # those that would bring most per km first
    shift_percent: float
    standard_error_percent: float
    interval_percent: Range  # Hartung and Knapp, never narrower than without their factor
    heterogeneity: Heterogeneity
    next_vehicle_percent: Range | None  # prediction interval; None for fewer than three vehicles
    confidence: float
    target_percent: float
    information_fraction: float
    distance_to_go_km: float | None  # of all vehicles together, each driving on as it does; None: out of reach
    days_to_go: float | None
    vehicles_needed: int | None  # in all, where these alone cannot resolve the target; None: these can, or none could

    @property
    def resolved(self) -> bool:
        return self.information_fraction >= 1


@dataclass(frozen=True)
class FleetAssessment:
    """A fleet in a month: vehicles furthest from their own expectation first, then pooled shifts."""

    month: str  # YYYY-MM
    confidence: float
    false_discovery_rate: float
    vehicles: tuple[VehicleReview, ...]
    pooled: tuple[PooledShift, ...]
    distance_km: float
    energy: Mapping[str, float]  # by unit

    @property
    def attention(self) -> tuple[VehicleReview, ...]:
        return tuple(each for each in self.vehicles if each.attention)

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}


@dataclass(frozen=True)
class Alone:
    """The same without controls."""

    shift_percent: float
    standard_error_percent: float
    information_fraction: float


@dataclass(frozen=True)
class ControlledShift:
    """A modification's shift beside control vehicles of the same run."""

    vehicle: str
    modification: str
    controls: tuple[str, ...]
    verdict: Verdict
    shift_percent: float | None
    interval_percent: Range | None  # look-proof
    standard_error_percent: float | None
    degrees_of_freedom: float | None
    confidence: float
    target_percent: float
    information_fraction: float | None
    distance_modified_km: float
    distance_to_go_km: float | None  # None: out of reach of what can be compared at once
    common_share: float | None  # of the drift's variance, 0 to 1; None: no control has a record yet
    common_share_sd: float | None
    alone: Alone | None
    looks: tuple[Look, ...]

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}
