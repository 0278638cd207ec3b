"""Graded parts in a regression: the shift of one is that of its newest level, or its average over mixed levels.

A part at several levels enters as the share of the distance it was fitted, at whatever level. Beside it stand how far
the level was from a centre and, with three levels or more, the square of that. Where each level was driven in one
block, the centre is the newest level: both are zero there, so the share's coefficient is the effect at that level.
Where levels were mixed, the centre is their mean by distance, and the square is taken less its own mean: both average
zero over the distance driven with the part, so the share's coefficient is the average effect. A level of none need not
be a level of 0. In a segment of two levels their mean is squared.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference.noise import Array

_SQUARED = ", squared"
_FOR_A_BEND = 3  # distinct levels
_DIGITS = 9
_TO_COUNT = 2  # segments from which on a level counts: one alone may be the mean of two levels that met in mid-tank


@dataclass(frozen=True)
class Newest:
    """The level a part was set to last."""

    level: float
    since_km: float  # position on the log's own scale
    others: bool  # were driven before it


def newest_level(observed: Observations, name: str) -> Newest | None:
    """What is asked of a part: its effect at the newest level. None: its average over the levels, as they were mixed.

    Levels are mixed where one came back after another, whatever was driven without the part in between.
    """
    column = observed.names.index(name)
    driven = np.flatnonzero(observed.fitted[:, column] > 0)
    levels = np.round(_level(observed, column)[driven], _DIGITS)
    different = np.unique(levels)
    if different.size > 1:
        counting = [level for level in different if np.count_nonzero(levels == level) >= _TO_COUNT]
        kept = np.isin(levels, counting)
        driven, levels = driven[kept], levels[kept]
    if not levels.size or np.count_nonzero(np.diff(levels)) + 1 > np.unique(levels).size:
        return None
    first = driven[np.argmax(levels == levels[-1])]
    return Newest(float(levels[-1]), float(observed.start_km[first]), different.size > 1)


def averaged(observed: Observations) -> Observations:
    """Every modification as its share of the distance, those at several levels with their level terms beside."""
    graded = [name for k, name in enumerate(observed.names) if _levels(observed, k).size > 1]
    shares = observed.fitted
    found = replace(observed, shares=shares, levels=np.maximum.accumulate((shares > 0).astype(float), axis=0))
    for name in graded:
        for term, column in zip(level_terms(name), _columns(observed, observed.names.index(name)), strict=False):
            found = found.adding(term, column, shares[:, observed.names.index(name)])
    return found


def level_terms(name: str) -> tuple[str, str]:
    """Names of the columns that stand beside a graded part."""
    return f"the level of {name}", f"the level of {name}{_SQUARED}"


def parts(names: tuple[str, ...]) -> tuple[str, ...]:
    """The modifications among the names of columns, without level terms."""
    beside = {term for name in names for term in level_terms(name)}
    return tuple(name for name in names if name not in beside)


def together_named(name: str) -> str:
    """One name for the level terms of a part; that of any other column as it is."""
    return name.removesuffix(_SQUARED)


def _levels(observed: Observations, column: int) -> Array:
    """Distinct levels driven with it (k,)."""
    fitted = observed.fitted[:, column]
    on = fitted > 0
    levels: Array = np.unique(np.round(observed.shares[on, column] / fitted[on], _DIGITS))
    return levels


def _columns(observed: Observations, column: int) -> list[Array]:
    """Deviation (n,) of the level from its centre, and with enough levels its square; times the share."""
    fitted, (middle, spread) = observed.fitted[:, column], centre(observed, observed.names[column])
    apart = _level(observed, column) - middle
    if _levels(observed, column).size < _FOR_A_BEND:
        return [fitted * apart]
    return [fitted * apart, fitted * (apart**2 - spread)]


def centre(observed: Observations, name: str) -> tuple[float, float]:
    """The newest level and 0; of mixed levels their mean by distance and the mean square of the deviation from it."""
    newest = newest_level(observed, name)
    if newest is not None:
        return newest.level, 0.0
    column = observed.names.index(name)
    driven, level = observed.distance_km * observed.fitted[:, column], _level(observed, column)
    mean = float(driven @ level / driven.sum())
    return mean, float(driven @ (level - mean) ** 2 / driven.sum())


def _level(observed: Observations, column: int) -> Array:
    """Level of each segment (n,), 0 where nothing of it was driven with the part."""
    fitted, shares = observed.fitted[:, column], observed.shares[:, column]
    level: Array = np.divide(shares, fitted, out=np.zeros(len(shares)), where=fitted > 0)
    return level
