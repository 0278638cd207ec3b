"""The answers, as plain frozen values. Standard library only, so that showing them needs no scientific stack.

Percentages are percent of consumption; negative shifts are savings. Distances are km, times days.
A figure that does not exist is None, never 0 or NaN.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass
from typing import Any, Literal

Verdict = Literal["shifted", "no-shift-of-target-size", "not-yet", "out-of-reach", "no-baseline", "closed-unclear"]
Rule = Literal["every-look", "counted", "open-ended"]
KnownChange = Literal["seen", "seen-otherwise", "not-seen-yet"]
Range = tuple[float, float]


@dataclass(frozen=True)
class Noise:
    """The four sources of scatter. trip, drift: sd in percent of consumption for an average segment."""

    trip_percent: float
    level_error: float  # sd of one filling or reading, in the vehicle's energy unit
    drift_weeks_percent: float
    drift_seasons_percent: float


@dataclass(frozen=True)
class Covariate:
    """One regression term: change of consumption in percent per unit of the term."""

    estimate: float
    standard_error: float
    effect_percent: float  # change over the middle 80 % of the conditions met in this log
    low: float  # those conditions: 10th and 90th percentile of the underlying condition
    high: float
    condition: str  # the condition behind the term: temperature_c, speed_kmh, season, or the column's name


@dataclass(frozen=True)
class Look:
    """The state of the test after one closed segment."""

    odometer_km: float
    date: str
    information_fraction: float
    shift_percent: float
    interval_percent: Range | None  # None: the range is unbounded at this look
    bound: float | None  # look-proof bound on |shift| / standard error; None: beyond any number


@dataclass(frozen=True)
class Expectation:
    """What the fitted model expects of a segment at given conditions: enough for an echo without heavy libraries."""

    consumption: float  # energy per km at the reference conditions, without modification
    shift_percent: float | None  # of the modification assessed
    sd_percent: float  # of one average segment around its expectation
    terms: Mapping[str, float]  # term -> percent per unit of the term
    centres: Mapping[str, float]  # term -> its value at the reference conditions


@dataclass(frozen=True)
class Remedy:
    """One way to bring the target within reach, or closer."""

    what: Literal["larger-target", "alternate", "longer-baseline"]
    detail: str  # e.g. "every 2 fill-ups"
    target_percent: float
    distance_km: float | None  # further distance it takes; None: not within the horizon either


@dataclass(frozen=True)
class SetAside:
    """An entry whose segment stands out from its neighbours, and which the answer therefore leaves out or merges."""

    odometer_km: float | None  # None: a log without an odometer
    date: str
    energy: float  # as logged, in the vehicle's unit
    deviation_sd: float  # of its consumption from what its neighbours predict, in robust sd; above 0: too much
    suspicion: str  # what may have happened
    suggestion: str  # what would fit
    merged_with_next: bool  # only the level after it is doubted: its driving counts, together with the next
    end_km: float  # position on the log's own scale


@dataclass(frozen=True)
class WithAll:
    """The answer if nothing were set aside."""

    verdict: Verdict
    shift_percent: float | None
    interval_percent: Range | None


@dataclass(frozen=True)
class Assessment:
    """Has the modification shifted consumption, by how much, and was the distance enough to say so?"""

    vehicle: str
    modification: str
    unit: str
    verdict: Verdict
    shift_percent: float | None
    interval_percent: Range | None  # look-proof
    standard_error_percent: float | None
    degrees_of_freedom: float | None
    confidence: float
    power: float
    target_percent: float
    information_fraction: float | None
    distance_baseline_km: float
    distance_modified_km: float
    segments_baseline: int
    segments_modified: int
    distance_needed_km: float | None  # modified distance at which the target is covered
    distance_to_go_km: float | None
    distance_to_go_interval_km: tuple[float, float | None] | None  # 80 %; None: upper end beyond the horizon
    days_to_go: float | None
    distance_expected_km: float | None  # modified distance expected if the true shift equals the target
    settled_at_km: float | None
    settled_on: str | None
    resolvable_now_percent: float | None
    resolvable_at_best_percent: float | None  # with this baseline and one switch, however far is driven
    noise: Noise | None
    covariates: Mapping[str, Covariate]
    looks: tuple[Look, ...]
    remedies: tuple[Remedy, ...]
    expectation: Expectation | None
    warnings: tuple[str, ...]
    rule: Rule = "every-look"  # for looks
    known_percent: Range | None = None  # shift expected of a known change
    known_change: KnownChange | None = None  # whether the log saw it
    known_change_logged: bool = True  # of this vehicle, ever
    set_aside: tuple[SetAside, ...] = ()
    verdict_with_all: WithAll | None = None  # None: nothing was set aside

    @property
    def is_open(self) -> bool:
        return self.verdict in ("not-yet", "out-of-reach", "no-baseline")

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}


@dataclass(frozen=True)
class Design:
    """One way to run a test, and the distance it takes."""

    name: Literal["one-switch", "alternate"]
    every_fillups: int | None  # None for one switch
    swaps: int | None
    distance_km: float | None  # from now until the target is covered; None: out of reach
    distance_interval_km: tuple[float, float | None] | None  # 80 %
    days: float | None
    resolvable_percent: Mapping[str, float | None]  # further km -> smallest shift resolvable by then


@dataclass(frozen=True)
class Plan:
    """Designs compared for one vehicle and target; iterating over a plan gives its designs."""

    vehicle: str
    unit: str
    target_percent: float
    confidence: float
    power: float
    distance_baseline_km: float
    segments_baseline: int
    noise: Noise | None
    designs: tuple[Design, ...]
    warnings: tuple[str, ...]

    def __iter__(self) -> Iterator[Design]:
        return iter(self.designs)

    def __len__(self) -> int:
        return len(self.designs)

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}


def plain(value: Any) -> Any:
    """Mappings and sequences as dicts and lists, for JSON."""
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    return value
