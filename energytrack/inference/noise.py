"""Four sources of scatter in one covariance, and its restricted likelihood in linear time.

Relative units throughout: distance in mean segments, energy in mean segment energies, so that every standard
deviation is a fraction of the consumption of an average segment.

    u_i = trip_i + level_i - level_(i-1) + d_i (weeks(t_i) + seasons(t_i))

Trips are independent with variance proportional to distance; a level error is shared by the two segments that meet
there; the drifts are Ornstein-Uhlenbeck processes, whose precision matrix is tri-diagonal (Rue and Held, 2005). Given
drifts and levels the segments are independent, so the n x n covariance is never formed: the posterior precision of
(weeks, seasons, level), taken segment by segment, is a band of width three, factored by LAPACK's dpbtrf.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import lapack

Array = NDArray[np.float64]

HALF_LIFE_DAYS = (21.0, 180.0)  # of the drift of weeks and of the drift of seasons
_SAME_DAY = 0.02  # days; closer dates are taken as this far apart, so that the drift's precision stays finite
LATENT = 3  # weeks, seasons, level: the unknowns that come with each segment
_BLOCK = 2_000  # segments whose factor and columns fit a processor's cache together


class Scatter(NamedTuple):
    """Standard deviations of the four sources, in relative units."""

    trip: float
    level: float
    weeks: float
    seasons: float


@dataclass(frozen=True)
class Structure:
    """What is known of the scatter before its sizes are: n segments in driving order, arrays of shape (n,)."""

    distance: Array  # relative
    trip_shape: Array  # trip variance per trip^2: the distance itself for independent trips
    linked: NDArray[np.bool_]  # shares its start level with the segment before
    start_weight: Array  # sd of the level at the start, relative to a full fill
    end_weight: Array
    extra: Array  # further known variance, such as that of a filled-in temperature
    day: Array  # (n,) middle of each segment, none closer to the next than the drift allows
    drift: tuple[tuple[Array, Array], ...]  # diagonal (n,) and off-diagonal (n-1,) of each unit drift's precision
    drift_log_det: float  # of all drift precisions together


def structure(
    distance: Array,
    day: Array,
    linked: NDArray[np.bool_],
    start_weight: Array,
    end_weight: Array,
    *,
    extra: Array | None = None,
    trip_shape: Array | None = None,
) -> Structure:
    """The structure of n segments: relative distance, day (float) of the middle of each, and the levels they share."""
    gaps = np.maximum(np.diff(day), _SAME_DAY)
    drift, log_det = [], 0.0
    for half_life in HALF_LIFE_DAYS:
        kept = np.exp2(-gaps / half_life)
        lost = -np.expm1(-2 * np.log(2) * gaps / half_life)  # 1 - kept^2
        diagonal = np.ones(len(distance))
        diagonal[1:] = 1 / lost
        diagonal[:-1] += kept**2 / lost
        drift.append((diagonal, -kept / lost))
        log_det -= float(np.log(lost).sum())
    return Structure(
        distance=distance,
        trip_shape=distance if trip_shape is None else trip_shape,
        linked=linked,
        start_weight=start_weight,
        end_weight=end_weight,
        extra=np.zeros(len(distance)) if extra is None else extra,
        day=np.concatenate([[0.0], np.cumsum(gaps)]),
        drift=tuple(drift),
        drift_log_det=log_det,
    )


class Products(NamedTuple):
    """V^-1 taken between the columns of a matrix, and log det V."""

    cross: Array  # (q, q)
    log_det: float


def products(shape: Structure, scatter: Scatter, columns: Array) -> Products:
    """B' V^-1 B for B of shape (n, q), and log det V, in O(n q).

    Woodbury: V = R + A Q^-1 A', so V^-1 = R^-1 - R^-1 A M^-1 A' R^-1 with M = Q + A' R^-1 A banded. M = L L' is
    factored, and L^-1 A' R^-1 B found, block by block: the numbers of a block fit a processor's cache.
    """
    n, q = columns.shape
    cross, log_det = np.zeros((q, q)), -shape.drift_log_det
    coupling, last = np.zeros((LATENT, LATENT)), np.zeros((LATENT, q))  # of the block before: L's reach, and its rows
    for start in range(0, n, _BLOCK):
        size = min(_BLOCK, n - start)
        some = part(shape, start, min(start + size + 1, n))  # one more, for what it shares with the last of the block
        own, shared, remainder = loadings(some, scatter)
        weighted = columns[start : start + len(remainder)] / remainder[:, None]
        rows = own[:, :, None] * weighted[:, None, :]
        rows[:-1, 2] += shared[1:, None] * weighted[1:]
        band = posterior_precision(some, own, shared, remainder)[:, : LATENT * size]
        reach = _reach(band)
        _subtract(band, coupling @ coupling.T)
        factor, fault = lapack.dpbtrf(band, lower=1)
        if fault:
            raise FloatingPointError("the precision of drift and levels is not positive definite")
        flat = rows[:size].reshape(-1, q)
        flat[:LATENT] -= coupling @ last
        solved, _ = lapack.dtbtrs(factor, flat, uplo="L")
        cross += columns[start : start + size].T @ weighted[:size] - solved.T @ solved
        log_det += float(np.log(remainder[:size]).sum() + 2 * np.log(factor[0]).sum())
        coupling, last = _coupling(reach, factor), solved[-LATENT:]
    return Products((cross + cross.T) / 2, log_det)


def part(shape: Structure, start: int, stop: int) -> Structure:
    """Segments `start` to `stop` (exclusive) of a structure, as views; the drifts stay those of the whole."""
    cut = slice(start, stop)
    return Structure(
        shape.distance[cut],
        shape.trip_shape[cut],
        shape.linked[cut],
        shape.start_weight[cut],
        shape.end_weight[cut],
        shape.extra[cut],
        shape.day[cut],
        tuple((diagonal[cut], off[start : stop - 1]) for diagonal, off in shape.drift),
        shape.drift_log_det,
    )


def _reach(band: Array) -> Array:
    """Entries of M (3, 3) between the last unknowns of a block (columns) and the first of the next (rows)."""
    reach = np.zeros((LATENT, LATENT))
    for column in range(LATENT):
        for row in range(column + 1):
            reach[row, column] = band[LATENT + row - column, band.shape[1] - LATENT + column]
    return reach


def _coupling(reach: Array, factor: Array) -> Array:
    """Entries of L (3, 3) at the place of `reach`: reach times the inverse transpose of L's last corner."""
    corner = np.zeros((LATENT, LATENT))
    for column in range(LATENT):
        for row in range(column, LATENT):
            corner[row, column] = factor[row - column, factor.shape[1] - LATENT + column]
    coupling: Array = np.linalg.solve(corner, reach.T).T.astype(np.float64)
    return coupling


def _subtract(band: Array, corner: Array) -> None:
    """Take a symmetric matrix (3, 3) from the first corner of a band, in place."""
    for column in range(LATENT):
        for row in range(column, LATENT):
            band[row - column, column] -= corner[row, column]


def loadings(shape: Structure, scatter: Scatter) -> tuple[Array, Array, Array]:
    """Of each segment on its own latents (n, 3) and on the level before it (n,), and what is independent (n,)."""
    own = np.empty((shape.distance.size, LATENT))
    own[:, 0] = scatter.weeks * shape.distance
    own[:, 1] = scatter.seasons * shape.distance
    own[:, 2] = scatter.level * shape.end_weight
    start = scatter.level * shape.start_weight
    shared = np.where(shape.linked, -start, 0.0)
    remainder = scatter.trip**2 * shape.trip_shape + shape.extra + np.where(shape.linked, 0.0, start**2)
    return own, shared, remainder


def posterior_precision(shape: Structure, own: Array, shared: Array, remainder: Array) -> Array:
    """M in LAPACK's lower band storage (4, 3 n)."""
    band = np.zeros((LATENT + 1, shape.distance.size, LATENT))
    (weeks, weeks_off), (seasons, seasons_off) = shape.drift
    scaled = own / remainder[:, None]
    passed = shared / remainder
    band[0] = own * scaled
    band[0, :, 0] += weeks
    band[0, :, 1] += seasons
    band[0, :, 2] += 1.0
    band[0, :-1, 2] += shared[1:] * passed[1:]
    band[1, :, 0] = own[:, 0] * scaled[:, 1]
    band[1, :, 1] = own[:, 1] * scaled[:, 2]
    band[1, :-1, 2] = passed[1:] * own[1:, 0]
    band[2, :, 0] = own[:, 0] * scaled[:, 2]
    band[2, :-1, 2] = passed[1:] * own[1:, 1]
    band[3, :-1, 0] = weeks_off
    band[3, :-1, 1] = seasons_off
    band[3, :-1, 2] = passed[1:] * own[1:, 2]
    return band.reshape(LATENT + 1, -1)



def unit_covariances(shape: Structure) -> Array:
    """What each source at a standard deviation of 1 adds to the covariance of the segments (4, n, n)."""
    n = shape.distance.size
    found = np.zeros((4, n, n))
    here = np.arange(n)
    start = shape.start_weight
    passed_on = np.where(shape.linked, start, 0.0)[1:] * shape.end_weight[:-1]
    found[0, here, here] = shape.trip_shape
    found[1, here, here] = start**2 + shape.end_weight**2
    found[1, here[1:], here[:-1]] = found[1, here[:-1], here[1:]] = -passed_on
    apart = np.abs(shape.day[:, None] - shape.day)
    together = np.outer(shape.distance, shape.distance)
    for place, half_life in enumerate(HALF_LIFE_DAYS, start=2):
        found[place] = together * np.exp2(-apart / half_life)
    return found
