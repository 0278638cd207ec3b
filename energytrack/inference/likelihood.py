"""The restricted likelihood of one regression at given noise sizes, in linear time (Patterson and Thompson, 1971)."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from energytrack.inference.noise import Array, Scatter, Structure, products, unit_covariances


@dataclass(frozen=True)
class Prior:
    """Normal prior on one direction of the log standard deviations (trip, level, weeks, seasons)."""

    direction: tuple[float, float, float, float]
    median: float  # of the log
    log_sd: float


@dataclass(frozen=True)
class Problem:
    """Energy y (n,) explained by columns X (n, p); `precision` (p,) of the coefficients' own priors, 0 where none."""

    shape: Structure
    columns: Array
    energy: Array
    precision: Array
    priors: tuple[Prior, ...]
    free: tuple[int, ...] = (0, 1, 2, 3)  # which of the four log standard deviations are estimated

    @cached_property
    def stacked(self) -> Array:
        return np.column_stack([self.columns, self.energy])

    @cached_property
    def sources(self) -> Array:
        """Covariance of the segments (4, n, n) from each source at a standard deviation of 1; for short logs."""
        return unit_covariances(self.shape)

    @cached_property
    def directions(self) -> Array:
        """Of the priors (k, 4)."""
        return np.array([prior.direction for prior in self.priors], dtype=np.float64).reshape(-1, 4)

    @cached_property
    def prior_precision(self) -> Array:
        """Of theta (4, 4), from the priors alone."""
        widths = np.array([prior.log_sd for prior in self.priors])
        precision: Array = self.directions.T @ (self.directions / widths[:, None] ** 2)
        return precision

    def prior_cost(self, theta: Array) -> float:
        """Minus the log prior at theta (4,), up to a constant."""
        return sum(
            0.5 * ((float(np.dot(prior.direction, theta)) - prior.median) / prior.log_sd) ** 2 for prior in self.priors
        )

    def prior_slope(self, theta: Array) -> Array:
        """Of minus the log prior at theta (4,)."""
        off = [(np.dot(prior.direction, theta) - prior.median) / prior.log_sd**2 for prior in self.priors]
        slope: Array = self.directions.T @ np.array(off)
        return slope


@dataclass(frozen=True)
class Point:
    """The model at given log standard deviations."""

    cost: float  # minus log restricted posterior, up to a constant
    coefficients: Array  # (p,)
    covariance: Array  # (p, p)


def evaluate(problem: Problem, theta: Array) -> Point:
    """Coefficients by generalised least squares (Aitken, 1935) and the restricted likelihood at theta (4,)."""
    cross, log_det = products(problem.shape, Scatter(*np.exp(theta)), problem.stacked)
    normal = cross[:-1, :-1] + np.diag(problem.precision)
    factor = np.linalg.cholesky(normal)
    half = np.linalg.solve(factor, np.column_stack([np.eye(len(normal)), cross[:-1, -1]]))
    inverse_factor, projected = half[:, :-1], half[:, -1]
    covariance = inverse_factor.T @ inverse_factor
    unexplained = cross[-1, -1] - projected @ projected
    cost = 0.5 * float(log_det + 2 * np.log(np.diag(factor)).sum() + unexplained)
    return Point(cost + problem.prior_cost(theta), inverse_factor.T @ projected, covariance)
