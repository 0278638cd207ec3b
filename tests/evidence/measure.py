"""Measured numbers with what sampling could have made of them."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from statsmodels.stats.proportion import proportion_confint

Array = NDArray[np.float64]

RESAMPLES = 2_000


@dataclass(frozen=True)
class Measured:
    """A number and its 95 % range of sampling: what it could be if more logs had been drawn."""

    value: float
    low: float
    high: float

    def percent(self) -> str:
        return f"{100 * self.value:.0f} % [{100 * self.low:.0f}, {100 * self.high:.0f}]"

    def ratio(self) -> str:
        return f"{self.value:.2f} [{self.low:.2f}, {self.high:.2f}]"


def proportion(happened: Iterable[bool], independent: int | None = None) -> Measured | None:
    """A share with Wilson's (1927) interval; None where nothing was counted.

    independent: how many of the trials are, where fewer than all; the range is that of so many trials.
    """
    trials = np.array(list(happened), dtype=float)
    if trials.size == 0:
        return None
    count = independent or trials.size
    low, high = proportion_confint(trials.mean() * count, count, method="wilson")
    return Measured(float(trials.mean()), float(low), float(high))


def resampled(statistic: Callable[..., Array], *samples: Iterable[float]) -> Measured | None:
    """A statistic along the last axis of paired samples, with its percentile bootstrap (Efron, 1979)."""
    arrays = [np.array(list(sample), dtype=float) for sample in samples]
    count = len(arrays[0])
    if count == 0:
        return None
    picks = np.random.default_rng(0).integers(count, size=(RESAMPLES, count))
    drawn = statistic(*(array[picks] for array in arrays))
    low, high = np.quantile(drawn, [0.025, 0.975], method="nearest")
    return Measured(float(statistic(*arrays)), float(low), float(high))


def rms(errors: Array) -> Array:
    return np.asarray(np.sqrt(np.mean(np.square(errors), axis=-1)))


def median(values: Array) -> Array:
    return np.asarray(np.median(values, axis=-1))


def rate(happened: Iterable[bool], independent: int | None = None) -> str:
    """A share in percent with its sampling range, or a dash where nothing was counted."""
    found = proportion(happened, independent)
    return "-" if found is None else found.percent()


def middle(values: Iterable[float], digits: int = 0) -> str:
    """Median, or a dash where there is none."""
    found = list(values)
    return f"{np.median(found):,.{digits}f}" if found else "-"


def middle_80(values: Iterable[float], digits: int = 2) -> str:
    """The range from the 10th to the 90th percentile, or a dash."""
    found = list(values)
    if not found:
        return "-"
    low, high = np.quantile(found, [0.1, 0.9], method="nearest")
    return f"{low:.{digits}f} to {high:.{digits}f}"
