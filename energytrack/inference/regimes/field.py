"""Every candidate break as a column of the same generalised least squares, all of them at once.

A break in the level is a column like a modification's: nothing before it, the distance after it. One pass of the
linear-time solver gives all products between the regression's own columns, K candidate columns (or K groups of q) and
the energies; whatever is asked about any set of breaks then follows from small matrices.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import cho_factor, cho_solve

from energytrack.inference.noise import Array, Scatter, products
from energytrack.inference.reml import Problem

_LEAST = 1e-9  # information of a candidate, relative to its own before others are taken out, that counts as any


@dataclass(frozen=True)
class Field:
    """What the data say about K candidates of q columns each, everything else estimated beside them."""

    precision: Array  # (K, q, K, q) inverse covariance of the candidates' effects
    score: Array  # (K, q)

    @property
    def gains(self) -> Array:
        """Wald statistic of each candidate alone (K,): how much it lowers the residual sum; 0 where it has no say."""
        blocks = np.einsum("kakb->kab", self.precision)
        sound = _sound(blocks)
        found = np.zeros(len(blocks))
        solved = np.linalg.solve(blocks[sound], self.score[sound][:, :, None])[:, :, 0]
        found[sound] = np.einsum("ka,ka->k", self.score[sound], solved)
        return found

    @property
    def unit_rows(self) -> Array:
        """Standardised effects of all sound candidates under no break are rows (K, q, K q) times unit noise."""
        blocks = np.einsum("kakb->kab", self.precision)
        sound = np.flatnonzero(_sound(blocks))
        count, q = len(sound), blocks.shape[1]
        roots = np.linalg.inv(np.linalg.cholesky(blocks[sound]))
        kept = self.precision[sound][:, :, sound]
        correlation = np.einsum("kac,kcld,lbd->kalb", roots, kept, roots).reshape(count * q, count * q)
        values, vectors = np.linalg.eigh(correlation)
        rows: Array = (vectors * np.sqrt(np.maximum(values, 0.0))).reshape(count, q, count * q)
        return rows


@dataclass(frozen=True)
class CrossProducts:
    """V^-1 between the regression's own p columns, K groups of q candidate columns, and the energies."""

    cross: Array  # (p + K q + 1, p + K q + 1)
    own: int  # p
    width: int  # q
    prior: Array  # (p,) precision of the own coefficients' priors

    def given(self, chosen: tuple[int, ...] = (), among: Array | None = None) -> Field:
        """The field of the candidates `among` (all by default) with the candidates `chosen` in the regression."""
        own = np.concatenate([np.arange(self.own), *(self._columns(np.array([k])) for k in chosen)]).astype(np.intp)
        count = (len(self.cross) - 1 - self.own) // self.width
        rest = self._columns(np.arange(count) if among is None else among)
        normal = self.cross[np.ix_(own, own)] + np.diag(np.append(self.prior, np.zeros(len(own) - self.own)))
        factor = cho_factor(normal)
        beside = self.cross[np.ix_(own, rest)]
        taken = cho_solve(factor, beside)
        precision = self.cross[np.ix_(rest, rest)] - beside.T @ taken
        score = self.cross[rest, -1] - taken.T @ self.cross[own, -1]
        diagonal = np.diag(precision)
        precision[diagonal < _LEAST * np.diag(self.cross)[rest]] = 0.0
        groups = len(rest) // self.width
        return Field(
            precision.reshape(groups, self.width, groups, self.width), score.reshape(groups, self.width)
        )

    def residual(self, chosen: tuple[int, ...]) -> float:
        """Generalised residual sum of squares with these candidates in the regression."""
        own = np.concatenate([np.arange(self.own), *(self._columns(np.array([k])) for k in chosen)]).astype(np.intp)
        normal = self.cross[np.ix_(own, own)] + np.diag(np.append(self.prior, np.zeros(len(own) - self.own)))
        right = self.cross[own, -1]
        return float(self.cross[-1, -1] - right @ np.linalg.solve(normal, right))

    def _columns(self, candidates: Array) -> Array:
        columns: Array = (self.own + self.width * candidates[:, None] + np.arange(self.width)).ravel()
        return columns


def cross_products(problem: Problem, scatter: Scatter, candidates: Array) -> CrossProducts:
    """One pass over the log for candidate columns (n, K, q), in the units of the problem's own columns."""
    n, _, width = candidates.shape
    columns = np.column_stack([problem.columns, candidates.reshape(n, -1), problem.energy])
    return CrossProducts(
        products(problem.shape, scatter, columns).cross, problem.columns.shape[1], width, problem.precision
    )


def _sound(blocks: Array) -> Array:
    """Which candidates (K, q, q) the log says anything about."""
    return np.linalg.eigvalsh(blocks)[:, 0] > 0
