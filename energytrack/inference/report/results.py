"""What a month's report is made of, as plain frozen values. Standard library only.

Consumption is energy per km, in the vehicle's unit; temperatures °C, speeds km/h, distances km.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from energytrack.inference.regimes.results import RegimeReport
from energytrack.inference.results import Assessment, Covariate, Noise
from energytrack.inference.review.results import Review
from energytrack.logbook.records import Event, Modification


@dataclass(frozen=True)
class Dot:
    """One segment: its condition as logged, and its consumption with everything else brought to the reference."""

    value: float
    consumption: float
    distance_km: float


@dataclass(frozen=True)
class Step:
    """The fitted curve at one value of the condition, with its range."""

    value: float
    consumption: float
    low: float
    high: float


@dataclass(frozen=True)
class Curve:
    """How consumption answers to one condition: other conditions at the reference, nothing fitted."""

    condition: Literal["temperature_c", "speed_kmh"]
    dots: tuple[Dot, ...]
    steps: tuple[Step, ...]  # from the lowest value met to the highest
    confidence: float
    filled_in: int  # segments without a logged value, which are no dots


@dataclass(frozen=True)
class Tried:
    """The test of one modification, and how far had been driven with it at each of its looks."""

    answer: Assessment
    driven_km: tuple[float, ...]


@dataclass(frozen=True)
class Scatter:
    """The noise of the vehicle's log, and the average segment it belongs to."""

    noise: Noise
    segment_energy: float
    charges_only: bool


@dataclass(frozen=True)
class MonthReport:
    """One vehicle's month and all that is drawn of it, by the log up to the end of that month."""

    review: Review
    regimes: RegimeReport
    tried: tuple[Tried, ...]
    curves: tuple[Curve, ...]  # empty where the log is too short for a fit
    covariates: Mapping[str, Covariate]
    scatter: Scatter | None
    modifications: tuple[Modification, ...]
    events: tuple[Event, ...]
