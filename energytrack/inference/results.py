"""The answers, as plain frozen values. Standard library only, so that showing them needs no scientific stack.

Percentages are percent of consumption; negative shifts are savings. Distances are km, times days.
A figure that does not exist is None, never 0 or NaN.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, field
from typing import TYPE_CHECKING, Any, Literal

if TYPE_CHECKING:
    from energytrack.inference.regimes.results import Break

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
class Confounder:
    """A condition, or another modification, that changed together with the one asked about."""

    condition: str
    inflation: float  # of the variance of the shift, by not knowing the response to it
    cost_km: float | None  # of the distance to go; None where the test is over or the target is out of reach


@dataclass(frozen=True)
class Advice:
    """Driving that tells more than the usual."""

    condition: str
    value: float
    fitted: bool
    times_usual: float  # information of such a segment, relative to the usual one


@dataclass(frozen=True)
class Effect:
    """One modification's shift, estimated beside all others."""

    name: str
    shift_percent: float
    interval_percent: Range | None  # look-proof
    standard_error_percent: float
    degrees_of_freedom: float


@dataclass(frozen=True)
class Together:
    """Several modifications of one vehicle: each alone, and all at once, None where no two ever were."""

    each: tuple[Effect, ...]
    all_at_once: Effect | None


@dataclass(frozen=True)
class PairwiseShift:
    """One variant against another; percent of consumption with nothing fitted."""

    one: str
    other: str
    shift_percent: float  # of `one` relative to `other`: negative where `one` uses less
    interval_percent: Range | None  # holds for all pairs and all looks together
    information_fraction: float
    differs: bool  # zero lies outside the range


@dataclass(frozen=True)
class Standing:
    """A variant's shift against the bare vehicle, and the chance that none uses less."""

    name: str
    shift_percent: float
    chance_best: float


@dataclass(frozen=True)
class Comparison:
    """Variants of a part held against each other and against the bare vehicle."""

    vehicle: str
    confidence: float
    pairs: tuple[PairwiseShift, ...]
    standings: tuple[Standing, ...]  # the likeliest best first
    warnings: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}


@dataclass(frozen=True)
class LevelEffect:
    """A level that was driven, and its shift against the reference level."""

    level: float
    shift_percent: float
    interval_percent: Range | None  # look-proof


@dataclass(frozen=True)
class Response:
    """How consumption answers to the level of a graded modification."""

    vehicle: str
    modification: str
    form: Literal["line", "parabola"]
    reference_level: float  # 0: not fitted
    levels: tuple[LevelEffect, ...]
    per_level: Effect  # of one unit of the level, at the reference
    best_level: float | None  # of least consumption; None where there is none inside the tried range
    best_level_interval: Range | None
    next_level: float | None  # worth trying next; None where the best one has been driven
    confidence: float
    warnings: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}


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
    amend: tuple[str, ...] = ()  # what to type after `energytrack amend` if that is so


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
    confounders: tuple[Confounder, ...] = ()  # costliest first
    advice: tuple[Advice, ...] = ()  # driving worth seeking
    never_apart: tuple[str, ...] = ()  # modifications this answer is for as well: the log cannot tell them apart
    together: Together | None = None  # None where the log holds no other modification
    response: Response | None = None  # None where the modification has no levels
    rule: Rule = "every-look"  # for looks
    known_percent: Range | None = None  # shift expected of a known change
    known_change: KnownChange | None = None  # whether the log saw it
    known_change_logged: bool = True  # of this vehicle, ever
    set_aside: tuple[SetAside, ...] = ()
    verdict_with_all: WithAll | None = None  # None: nothing was set aside
    reversible: bool = True  # the modification can be taken off again
    levels_known: bool = True  # False: no two entries tell the level they left, so nothing is measured
    undeclared: tuple[Break, ...] = ()  # changes of consumption beside the modifications that nothing logged explains
    withheld: bool = False  # a shift was found, but one of those lies inside the test
    agreeing: Break | None = None  # the change that a search blind to modifications finds at this one
    level: float | None = None  # of several: the one the answer is for; None: all of them, on average
    level_since_km: float | None = None  # odometer value at which it was first driven
    fitted_now: bool = True  # and not at the level that others are counted from

    @property
    def is_open(self) -> bool:
        return self.verdict in ("not-yet", "out-of-reach", "no-baseline")

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}


DesignName = Literal["one-switch", "best-date", "on-off-on", "alternate", "alternate-weekly", "longer-baseline"]


@dataclass(frozen=True)
class Design:
    """One way to run a test, and the distance it takes."""

    name: DesignName
    every_fillups: int | None  # between swaps where it alternates by fill-ups
    swaps: int | None
    distance_km: float | None  # from now until the target is covered; None: out of reach
    distance_interval_km: tuple[float, float | None] | None  # 80 %
    days: float | None
    resolvable_percent: Mapping[str, float | None]  # further km -> smallest shift resolvable by then
    start: str | None = None  # date at which it is fitted, where that is not now
    phases: tuple[int, ...] = ()  # fill-ups of each phase before the last, which goes on to the end
    costliest: str | None = None  # what adds most to the variance of the shift
    costliest_share: float | None = None  # by which the variance would fall without it
    cost_shares: Mapping[str, float] = field(default_factory=dict)  # of every source and condition; they overlap


@dataclass(frozen=True)
class LongerBaseline:
    """A longer baseline than the stated one, and the distance one switch would then take (km)."""

    baseline_km: float
    distance_km: float


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
    reversible: bool = True  # False: only designs that never take it off
    stated: bool = False  # the noise and the driving are stated, not measured
    levels_known: bool = True  # False: no two entries tell the level they left, so nothing is measured

    with_longer_baseline: LongerBaseline | None = None  # of stated driving, where one switch is far or out of reach

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
