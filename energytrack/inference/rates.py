"""Shares of drawn logs and quantiles of distance, each with its own sampling error."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from scipy.special import bdtr, betaincinv

from energytrack.inference.rehearsal_results import Rate, Settled

_TAIL = 0.025  # of the 95 % ranges, on each side
_LOW, _HIGH = 0.10, 0.90


def rate(count: int, of: int) -> Rate:
    """A share in percent with its exact 95 % range (Clopper and Pearson, 1934). `of` is at least 1."""
    low = float(betaincinv(count, of - count + 1, _TAIL)) if count else 0.0
    high = float(betaincinv(count + 1, of - count, 1 - _TAIL)) if count < of else 1.0
    return Rate(count, of, 100 * count / of, (100 * low, 100 * high))


def settled(distances_km: Sequence[float | None]) -> Settled | None:
    """Median and 80 % range over all logs, those never settled (None) counted as farther than any distance.

    The median's own 95 % range is the usual one between order statistics (David and Nagaraja, 2003, 7.1).
    """
    ordered = sorted(math.inf if km is None else km for km in distances_km)
    if not ordered or ordered[0] == math.inf:
        return None
    count = len(ordered)
    outside = int((bdtr(np.arange(count), count, 0.5) <= _TAIL).sum())  # order statistics left out on each side
    low, high = ordered[max(outside - 1, 0)], ordered[min(count - outside, count - 1)]
    return Settled(
        median_km=_finite(_quantile(ordered, 0.5)),
        median_interval_km=(_finite(low), _finite(high)),
        range_km=(_finite(_quantile(ordered, _LOW)), _finite(_quantile(ordered, _HIGH))),
    )


def _quantile(ordered: Sequence[float], q: float) -> float:
    return ordered[min(math.ceil(q * len(ordered)), len(ordered)) - 1]


def _finite(km: float) -> float | None:
    return km if math.isfinite(km) else None
