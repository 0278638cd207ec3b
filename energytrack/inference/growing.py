"""The information in every beginning of a log, in one pass.

A log that ends at segment k has the posterior precision of drift and levels of the whole log up to there, less what
segment k + 1 adds to the last block. All blocks before the last are those of the whole log, and so are their Cholesky
factors: only the last three unknowns are solved anew for each k, all k at once.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import lapack

from energytrack.inference.noise import LATENT, Array, Scatter, Structure, loadings, posterior_precision


def growing_products(shape: Structure, scatter: Scatter, columns: Array, first: int = 1) -> Array:
    """B' V^-1 B of the first k segments, for k = first ... n: (n - first + 1, q, q) for B of shape (n, q)."""
    n, q = columns.shape
    own, shared, remainder = loadings(shape, scatter)
    factor, fault = lapack.dpbtrf(posterior_precision(shape, own, shared, remainder), lower=1)
    if fault:
        raise FloatingPointError("the precision of drift and levels is not positive definite")
    weighted = columns / remainder[:, None]
    ending = own[:, :, None] * weighted[:, None, :]  # right sides of a log that ends here (n, 3, q)
    going_on = ending.copy()
    going_on[:-1, 2] += shared[1:, None] * weighted[1:]
    forward = lapack.dtbtrs(factor, going_on.reshape(-1, q), uplo="L")[0].reshape(n, LATENT, q)
    below = _blocks_below(factor, n)
    last = _last_blocks(shape, own, remainder)
    last[1:] -= below @ below.transpose(0, 2, 1)
    ending[1:] -= below @ forward[:-1]
    last, ending = last[first - 1 :], ending[first - 1 :]
    absorbed = ending.transpose(0, 2, 1) @ np.linalg.solve(last, ending)
    gathered = columns[:, :, None] * weighted[:, None, :]
    gathered[1:] -= forward[:-1].transpose(0, 2, 1) @ forward[:-1]
    cross: Array = np.cumsum(gathered, axis=0)[first - 1 :] - absorbed
    return (cross + cross.transpose(0, 2, 1)) / 2


def _blocks_below(factor: Array, n: int) -> Array:
    """The factor's blocks between a segment's unknowns and those of the one before it (n - 1, 3, 3)."""
    below = np.zeros((n - 1, LATENT, LATENT))
    for row in range(LATENT):
        for column in range(row, LATENT):
            below[:, row, column] = factor[LATENT + row - column].reshape(n, LATENT)[:-1, column]
    return below


def _last_blocks(shape: Structure, own: Array, remainder: Array) -> Array:
    """Posterior precision of the last segment's unknowns, for a log that ends at each segment (n, 3, 3)."""
    blocks: Array = own[:, :, None] * own[:, None, :] / remainder[:, None, None]
    for place, (_, off) in enumerate(shape.drift):
        blocks[0, place, place] += 1.0
        blocks[1:, place, place] += (1 + np.sqrt(1 + 4 * off**2)) / 2  # 1 / lost, where off = -kept / lost
    blocks[:, LATENT - 1, LATENT - 1] += 1.0
    return blocks
