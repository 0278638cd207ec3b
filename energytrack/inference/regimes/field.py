"""Every candidate break as a column of the same generalised least squares, all of them at once.

A break in the level is a column like a modification's: nothing before it, the distance after it. One pass of the
linear-time solver gives all products between the regression's own columns, K candidates of q columns each, and the
energies; whatever is asked about any set of breaks then follows from small matrices.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve

from energytrack.inference.likelihood import Problem
from energytrack.inference.noise import Array, Scatter, products

_WORST = 1e10  # condition of a candidate's columns beyond which they cannot be told apart


@dataclass(frozen=True)
class Field:
    """What the data say about K candidates of q columns each, everything else estimated beside them."""

    rows: Array  # (K, q, r): their inner products are the inverse covariance of the candidates' effects
    score: Array  # (K, q)

    @property
    def gains(self) -> Array:
        """Wald statistic of each candidate alone (K,): how much it lowers the residual sum; 0 where it has no say."""
        blocks, sound = self._blocks()
        found = np.zeros(len(sound))
        solved = np.linalg.solve(blocks[sound], self.score[sound][:, :, None])[:, :, 0]
        found[sound] = np.einsum("ka,ka->k", self.score[sound], solved)
        return found

    @property
    def unit_rows(self) -> Array:
        """Under no break the standardised effects of all sound candidates are these rows times unit noise (r,)."""
        blocks, sound = self._blocks()
        rows: Array = np.linalg.solve(np.linalg.cholesky(blocks[sound]), self.rows[sound])
        return rows

    def joined(self, groups: NDArray[np.intp]) -> Field:
        """Groups (G, s) of candidates as candidates of s q columns each."""
        count, _, r = len(groups), *self.rows.shape[1:]
        return Field(self.rows[groups].reshape(count, -1, r), self.score[groups].reshape(count, -1))

    def _blocks(self) -> tuple[Array, NDArray[np.bool_]]:
        """Inverse covariance of each candidate's effects (K, q, q), and whether the log says anything about them."""
        blocks: Array = self.rows @ self.rows.transpose(0, 2, 1)
        values = np.linalg.eigvalsh(blocks)
        return blocks, np.asarray(values[:, 0] * _WORST > np.maximum(values[:, -1], values[:, -1].max() / _WORST))


@dataclass(frozen=True)
class CrossProducts:
    """V^-1 between the regression's own p columns, K groups of q candidate columns, and the energies."""

    cross: Array  # (p + K q + 1, p + K q + 1)
    own: int  # p
    width: int  # q
    prior: Array  # (p,) precision of the own coefficients' priors

    def given(self, chosen: Sequence[int], among: Sequence[int]) -> Field:
        """The field of the candidates `among` with the candidates `chosen` in the regression."""
        own, normal = self._regression(chosen)
        rest = self._columns(among)
        beside = self.cross[np.ix_(own, rest)]
        taken = cho_solve(cho_factor(normal), beside)
        precision = self.cross[np.ix_(rest, rest)] - beside.T @ taken
        score = self.cross[rest, -1] - taken.T @ self.cross[own, -1]
        values, vectors = np.linalg.eigh(precision)
        rows = vectors * np.sqrt(np.maximum(values, 0.0))
        return Field(rows.reshape(len(among), self.width, -1), score.reshape(len(among), self.width))

    def residual(self, chosen: Sequence[int]) -> float:
        """Generalised residual sum of squares with these candidates in the regression."""
        own, normal = self._regression(chosen)
        right = self.cross[own, -1]
        return float(self.cross[-1, -1] - right @ cho_solve(cho_factor(normal), right))

    def _regression(self, chosen: Sequence[int]) -> tuple[NDArray[np.intp], Array]:
        """Indices of the regression's columns, the chosen candidates' included, and its normal matrix."""
        own = np.concatenate([np.arange(self.own), self._columns(chosen)])
        return own, self.cross[np.ix_(own, own)] + np.diag(np.append(self.prior, np.zeros(len(own) - self.own)))

    def _columns(self, candidates: Sequence[int]) -> NDArray[np.intp]:
        first = self.own + self.width * np.array(candidates, dtype=np.intp)
        columns: NDArray[np.intp] = (first[:, None] + np.arange(self.width)).ravel()
        return columns


def cross_products(problem: Problem, scatter: Scatter, candidates: Array) -> CrossProducts:
    """One pass over the log for candidate columns (n, K, q), in the units of the problem's own columns."""
    n, _, width = candidates.shape
    columns = np.column_stack([problem.columns, candidates.reshape(n, -1), problem.energy])
    return CrossProducts(
        products(problem.shape, scatter, columns).cross, problem.columns.shape[1], width, problem.precision
    )
