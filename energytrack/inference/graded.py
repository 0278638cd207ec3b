"""Graded parts in a regression: the shift of one is its average over the levels driven so far.

A part at several levels enters as the share of the distance it was fitted, at whatever level. Beside it stand how far
the level was from its mean so far and, with three levels or more, the square of that less its own mean. Both average
zero over the distance driven with the part, so whatever the response to the level is, the share's coefficient is the
average effect, and a level of none need not be a level of 0. In a segment of two levels their mean is squared.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference.noise import Array

_SQUARED = ", squared"
_FOR_A_BEND = 3  # distinct levels
_DIGITS = 9


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
    """Deviation (n,) of the level from its mean by distance, and with enough levels its square; times the share."""
    fitted, (mean, spread) = observed.fitted[:, column], centre(observed, observed.names[column])
    apart = _level(observed, column) - mean
    if _levels(observed, column).size < _FOR_A_BEND:
        return [fitted * apart]
    return [fitted * apart, fitted * (apart**2 - spread)]


def centre(observed: Observations, name: str) -> tuple[float, float]:
    """Mean of the level by distance driven with the part, and the mean square of the deviation from it."""
    column = observed.names.index(name)
    driven, level = observed.distance_km * observed.fitted[:, column], _level(observed, column)
    mean = float(driven @ level / driven.sum())
    return mean, float(driven @ (level - mean) ** 2 / driven.sum())


def _level(observed: Observations, column: int) -> Array:
    """Level of each segment (n,), 0 where nothing of it was driven with the part."""
    fitted, shares = observed.fitted[:, column], observed.shares[:, column]
    level: Array = np.divide(shares, fitted, out=np.zeros(len(shares)), where=fitted > 0)
    return level
