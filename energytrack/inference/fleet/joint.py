"""Several vehicles in one regression: what drifts for all of them is told from what drifts for one.

Each vehicle keeps its own columns, trips and levels. Its drifts of weeks and of seasons are split: the share c of
their variance is common to all vehicles of the run, so that between vehicles v and w

    cov(u_i, u_j) = c (weeks_v weeks_w 2^(-gap / 21 days) + seasons_v seasons_w 2^(-gap / 180 days)) d_i d_j

The sizes of each vehicle's noise are those of its own log. c is estimated by the restricted likelihood on a grid with
a flat prior, and the answer averages over what is left unknown of it. Dense: meant for up to about 1,000 segments.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.linalg import cho_factor, cho_solve

from energytrack.inference.model import Model
from energytrack.inference.noise import HALF_LIFE_DAYS, Array, Structure, unit_covariances
from energytrack.inference.shift import LEVEL, SHIFT, Shift

_GRID = np.linspace(0.0, 0.95, 9)  # of the common share; all of it would need the same driver and the same tank
_STEP = 0.02  # in log standard deviation


@dataclass(frozen=True)
class Part:
    """One vehicle in the regression, n segments and p columns, in relative units."""

    shape: Structure
    first_day: float  # date ordinal of the middle of its first segment
    columns: Array  # (n, p); of the first vehicle, level and the modification asked about come first
    energy: Array  # (n,)
    precision: Array  # (p,)
    theta: Array  # (4,)
    theta_covariance: Array  # (4, 4)

    @property
    def day(self) -> Array:
        return self.first_day + self.shape.day


def part_of(model: Model) -> Part:
    """A fitted log."""
    problem, fit = model.problem, model.fit
    first = float(model.observed.mid_day[0])
    return Part(
        problem.shape, first, problem.columns, problem.energy, problem.precision, fit.theta, fit.theta_covariance
    )


@dataclass(frozen=True)
class Solved:
    """The regression at stated noise and common share."""

    cost: float  # minus log restricted likelihood, up to a constant
    coefficients: Array  # (p,) of all vehicles
    covariance: Array  # (p, p)


@dataclass(frozen=True)
class Estimate:
    """The shift beside the controls, and the common share of the drift."""

    shift: Shift
    common: float  # posterior mean
    common_sd: float


@dataclass(frozen=True)
class Joint:
    """Vehicles of one run; the first one has the modification."""

    parts: Sequence[Part]

    def solve(self, thetas: Sequence[Array], common: float) -> Solved:
        """Generalised least squares (Aitken, 1935) and the restricted likelihood."""
        factor = cho_factor(self._covariance(thetas, common), lower=True, check_finite=False)
        whitened = cho_solve(factor, self._stacked, check_finite=False)
        cross = self._stacked.T @ whitened
        normal = cross[:-1, :-1] + np.diag(self._precision)
        covariance: Array = np.linalg.inv(normal).astype(np.float64)
        coefficients = covariance @ cross[:-1, -1]
        unexplained = cross[-1, -1] - coefficients @ cross[:-1, -1]
        log_det = 2 * float(np.log(np.diag(factor[0])).sum()) + float(np.linalg.slogdet(normal)[1])
        return Solved(0.5 * (log_det + float(unexplained)), coefficients, covariance)

    def estimate(self) -> Estimate:
        """The shift with the common share averaged over (law of total variance)."""
        thetas = [part.theta for part in self.parts]
        solved = [self.solve(thetas, float(c)) for c in _GRID]
        costs = np.array([each.cost for each in solved])
        weights = np.exp(costs.min() - costs)
        weights /= weights.sum()
        both = np.array([each.coefficients[:2] for each in solved])
        mean = weights @ both
        covariance = np.tensordot(weights, [each.covariance[:2, :2] for each in solved], 1)
        covariance = covariance + (both - mean).T @ (weights[:, None] * (both - mean))
        common = float(weights @ _GRID)
        spread = float(np.sqrt(weights @ (_GRID - common) ** 2))
        effect, base = float(mean[SHIFT]), float(mean[LEVEL])
        shift = Shift(
            effect,
            base,
            float(covariance[SHIFT, SHIFT]),
            float(covariance[LEVEL, LEVEL]),
            float(covariance[LEVEL, SHIFT]),
            self._freedom(common, effect / base, base),
        )
        return Estimate(shift, common, spread)

    def variance(self, common: float, ratio: float, base: float, thetas: Sequence[Array] | None = None) -> float:
        """Of the shift as a ratio, by the delta method."""
        solved = self.solve([part.theta for part in self.parts] if thetas is None else thetas, common)
        direction = np.array([-ratio, 1.0]) / base
        return float(direction @ solved.covariance[:2, :2] @ direction)

    def _freedom(self, common: float, ratio: float, base: float) -> float:
        """Degrees of freedom by Satterthwaite (1946): the noise of every vehicle is estimated from its own log."""
        thetas = [part.theta for part in self.parts]
        here = self.variance(common, ratio, base)
        wobble = 0.0
        for place, part in enumerate(self.parts):
            slope = np.zeros(4)
            for k in range(4):
                moved = list(thetas)
                moved[place] = thetas[place] + _STEP * np.eye(4)[k]
                slope[k] = (self.variance(common, ratio, base, moved) - here) / _STEP
            wobble += float(slope @ part.theta_covariance @ slope)
        return max(1.0, 2 * here**2 / wobble) if wobble > 0 else float("inf")

    def _covariance(self, thetas: Sequence[Array], common: float) -> Array:
        """Of all segments (n, n)."""
        sizes = [np.exp(theta) for theta in thetas]
        whole = np.zeros((self._starts[-1], self._starts[-1]))
        for v, part in enumerate(self.parts):
            own = slice(self._starts[v], self._starts[v + 1])
            whole[own, own] = np.tensordot(sizes[v] ** 2, self._sources[v], 1) + np.diag(part.shape.extra)
            for w in range(v):
                other = slice(self._starts[w], self._starts[w + 1])
                shared = common * np.tensordot(sizes[v][2:] * sizes[w][2:], self._between[v, w], 1)
                whole[own, other], whole[other, own] = shared, shared.T
        return whole

    @cached_property
    def _starts(self) -> list[int]:
        return [0, *np.cumsum([len(part.columns) for part in self.parts]).tolist()]

    @cached_property
    def _sources(self) -> list[Array]:
        return [unit_covariances(part.shape) for part in self.parts]

    @cached_property
    def _between(self) -> dict[tuple[int, int], Array]:
        """What each drift at a standard deviation of 1 shares between two vehicles (2, n_v, n_w)."""
        return {(v, w): _shared(self.parts[v], self.parts[w]) for v in range(len(self.parts)) for w in range(v)}

    @cached_property
    def _stacked(self) -> Array:
        """Columns of all vehicles side by side, each zero for the others, and the energy last (n, p + 1)."""
        widths = [0, *np.cumsum([part.columns.shape[1] for part in self.parts]).tolist()]
        stacked = np.zeros((self._starts[-1], widths[-1] + 1))
        for v, part in enumerate(self.parts):
            rows = slice(self._starts[v], self._starts[v + 1])
            stacked[rows, widths[v] : widths[v + 1]] = part.columns
            stacked[rows, -1] = part.energy
        return stacked

    @cached_property
    def _precision(self) -> Array:
        return np.concatenate([part.precision for part in self.parts])


def _shared(one: Part, other: Part) -> Array:
    gap = np.abs(one.day[:, None] - other.day)
    together = np.outer(one.shape.distance, other.shape.distance)
    return np.array([together * np.exp2(-gap / half_life) for half_life in HALF_LIFE_DAYS])
