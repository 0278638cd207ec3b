"""What a rehearsal found, as plain frozen values. Standard library only.

Percentages of logs come with an exact 95 % range (Clopper and Pearson, 1934) of their own sampling error. Distances
are km driven with the modification fitted. A figure that does not exist is None.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any

from energytrack.inference.results import Noise, Range, plain

Ends = tuple[float | None, float | None]


@dataclass(frozen=True)
class Rate:
    """So many of so many logs."""

    count: int
    of: int
    percent: float
    interval_percent: Range  # 95 %


@dataclass(frozen=True)
class Settled:
    """Distance with the modification at which the logs were settled; None: not within the log."""

    median_km: float | None
    median_interval_km: Ends  # 95 %, the sampling error of the median
    range_km: Ends  # 10th and 90th percentile of all logs


@dataclass(frozen=True)
class Scenario:
    """The drawn logs under one true shift."""

    shift_percent: float
    called_shifted: Rate  # in the true direction, where there is one
    called_no_shift: Rate  # of target size
    not_settled: Rate  # by the end of the log
    covered: Rate  # the range held the true shift at every look until the evidence was complete
    covered_at_end: Rate  # the range at the end of the log held it
    settled: Settled | None  # None where no log was


@dataclass(frozen=True)
class Placebo:
    """A change pretended where nothing was fitted or removed; counts of places called a shift."""

    segments_each_side: int
    places: int
    separate: int  # stretches that do not overlap: neighbouring places share most of their segments
    called_every_look: int  # look-proof, with a look after every entry
    called_one_look: int  # the plain range, looked at once
    averages_every_look: int  # Welch's test on the two averages, after every entry
    averages_one_look: int
    called_at_km: tuple[float, ...]  # odometer values of the places that this test, looking every time, called a shift


@dataclass(frozen=True)
class Rehearsal:
    """What would have been said of logs like this one, had their truth been known."""

    vehicle: str
    modification: str
    pretended: bool  # nothing was driven with a modification: one is pretended at the middle of the log
    unit: str
    target_percent: float
    confidence: float
    power: float
    runs: int
    seed: int
    segments_baseline: int
    segments_modified: int
    distance_modified_km: float
    looks: int  # taken of each log
    noise: Noise  # as fitted
    no_shift: Scenario
    target_shift: Scenario
    placebo: tuple[Placebo, ...]
    warnings: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        return {name: plain(value) for name, value in asdict(self).items()}
