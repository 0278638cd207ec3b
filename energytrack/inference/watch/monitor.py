"""A monitor carried on from segment to segment, in plain arithmetic: standard library only, so that logging stays fast.

The noise model of `inference/noise.py` is a small state space: coefficients, two drifts, and the level error that the
next segment pays back. A Kalman filter (1960) predicts each segment from those before it. Its prediction errors,
divided by their standard deviation, are independent and of unit variance while nothing changes. Two cumulative sums
(Page, 1954) of log likelihood ratios, one for a rise and one for a fall of the size worth finding, start anew whenever
they fall to zero; the one that passes the threshold says that consumption has moved, and since when.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import sqrt
from typing import NamedTuple

HALF_LIFE_DAYS = (21.0, 180.0)  # of the two drifts, as in inference/noise.py
LARGEST_SHARE = 0.75  # of the threshold, from a single segment: one slip of the pen raises no alarm
_BELIEVED = 4.0  # standard deviations of a prediction error that the filter learns from (Masreliez, 1975)
_SAME_DAY = 0.02


class Segment(NamedTuple):
    """One segment in relative units: distance in average segments, energy in their energies."""

    distance: float
    energy: float
    day: float  # date ordinal of its middle
    columns: Sequence[float]  # (p,) per unit distance: 1, terms, modifications
    extra: float  # variance of conditions that are not known
    linked: bool
    start_weight: float
    end_weight: float
    start_km: float
    start_date: str


class Filter(NamedTuple):
    """What is known after a segment of the coefficients (p,), the two drifts and the level error at its end."""

    noise: tuple[float, float, float, float]  # sd of trips, level, drift of weeks, of seasons
    mean: list[float]  # (p + 3,)
    covariance: list[list[float]]
    day: float | None  # of the last segment


class Sum(NamedTuple):
    """One cumulative sum, and what it has added up since it last stood at zero."""

    value: float = 0.0
    segments: int = 0
    since_km: float | None = None
    since_date: str | None = None
    score: float = 0.0  # sum of a x error, for the size of the shift
    information: float = 0.0  # sum of a^2


class Monitor(NamedTuple):
    """The filter and both sums. worth: shift they are built to find, as a share of consumption."""

    filter: Filter
    rise: Sum
    fall: Sum
    worth: float
    kept: float  # share of a lasting shift's effect on the errors that drift does not take over
    threshold: float


def start(noise: tuple[float, float, float, float], mean: Sequence[float], variance: Sequence[float]) -> Filter:
    """Before the first segment: priors of the coefficients (p,), the drifts at their own spread."""
    spread = [*variance, noise[2] ** 2, noise[3] ** 2, 1.0]
    size = len(spread)
    covariance = [[spread[a] if a == b else 0.0 for b in range(size)] for a in range(size)]
    return Filter(noise, [*mean, 0.0, 0.0, 0.0], covariance, None)


def predict(filtered: Filter, segment: Segment) -> tuple[Filter, float, float, list[float]]:
    """The filter moved on by time, prediction error, its variance, and covariance with the state and the new level."""
    moved = _moved(filtered, segment.day)
    trip, level = moved.noise[:2]
    reach = [segment.distance * value for value in segment.columns]
    start_error = level * segment.start_weight
    row = [*reach, segment.distance, segment.distance, -start_error if segment.linked else 0.0]
    variance = trip * trip * segment.distance + segment.extra + (0.0 if segment.linked else start_error * start_error)
    own = level * segment.end_weight
    with_state = [sum(map(_times, line, row)) for line in moved.covariance]
    total = sum(map(_times, row, with_state)) + own * own + variance
    error = segment.energy - sum(map(_times, row, moved.mean))
    return moved, error, total, [*with_state, own]


def learn(moved: Filter, error: float, variance: float, reached: Sequence[float]) -> Filter:
    """The filter after a segment. The level error before it gives way to the one after it."""
    limit = _BELIEVED * sqrt(variance)
    believed = max(-limit, min(limit, error)) / variance
    size = len(moved.mean) - 1
    gains = [*reached[:size], reached[-1]]
    prior = [line[:size] for line in moved.covariance[:size]]
    mean = [*moved.mean[:size], 0.0]
    mean = [value + gain * believed for value, gain in zip(mean, gains, strict=True)]
    covariance = [
        [
            (prior[a][b] if a < size and b < size else float(a == b)) - gains[a] * gains[b] / variance
            for b in range(size + 1)
        ]
        for a in range(size + 1)
    ]
    return Filter(moved.noise, mean, covariance, moved.day)


def advance(monitor: Monitor, segment: Segment) -> Monitor:
    """The monitor after one more segment."""
    moved, error, variance, reached = predict(monitor.filter, segment)
    sd = sqrt(variance)
    expected = monitor.worth * monitor.kept * moved.mean[0] * segment.distance / sd
    sums = [_added(total, sign * error / sd, expected, monitor.threshold, segment)
            for total, sign in ((monitor.rise, 1), (monitor.fall, -1))]  # fmt: skip
    return monitor._replace(filter=learn(moved, error, variance, reached), rise=sums[0], fall=sums[1])


def _added(total: Sum, error: float, expected: float, threshold: float, segment: Segment) -> Sum:
    gain = min(expected * error - expected * expected / 2, LARGEST_SHARE * threshold)
    value = total.value + gain
    if value <= 0:
        return Sum()
    if total.since_km is None:
        total = Sum(since_km=segment.start_km, since_date=segment.start_date)
    return total._replace(
        value=value,
        segments=total.segments + 1,
        score=total.score + gain + expected * expected / 2,
        information=total.information + expected * expected,
    )


def alarm(monitor: Monitor) -> tuple[Sum, float] | None:
    """The sum that passed the threshold and the shift it estimates, as a share of consumption; None while neither."""
    rise, fall = monitor.rise, monitor.fall
    highest, sign = (rise, 1.0) if rise.value >= fall.value else (fall, -1.0)
    if highest.value <= monitor.threshold:
        return None
    return highest, sign * monitor.worth * highest.score / highest.information


def _moved(filtered: Filter, day: float) -> Filter:
    """Ornstein-Uhlenbeck drifts relax towards zero and spread again while time passes."""
    if filtered.day is None:
        return filtered._replace(day=day)
    gap = max(day - filtered.day, _SAME_DAY)
    size = len(filtered.mean)
    factors = [1.0] * size
    factors[-3], factors[-2] = (0.5 ** (gap / half_life) for half_life in HALF_LIFE_DAYS)
    mean = [value * factor for value, factor in zip(filtered.mean, factors, strict=True)]
    covariance = [
        [value * factors[a] * factors[b] for b, value in enumerate(line)]
        for a, line in enumerate(filtered.covariance)
    ]
    for place, sd in ((-3, filtered.noise[2]), (-2, filtered.noise[3])):
        covariance[place][place] += sd * sd * (1 - factors[place] ** 2)
    return Filter(filtered.noise, mean, covariance, filtered.day + gap)


def _times(a: float, b: float) -> float:
    return a * b
