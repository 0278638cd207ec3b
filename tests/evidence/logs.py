"""Simulated logs as the inference sees them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Protocol, TypeVar

import numpy as np

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.inference.question import Question
from tests.evidence.goals import ALL
from tests.simulation import simulate
from tests.uses import Use

QUESTION = Question("part", target=0.03, alpha=0.05, power=0.80)


@dataclass(frozen=True)
class Job:
    """One log to draw: its kind of use and its seed."""

    use: Use
    seed: int


def jobs(uses: tuple[Use, ...], logs: int, first_seed: int) -> list[Job]:
    return [Job(use, first_seed + k) for use in uses for k in range(logs)]


def sample(uses: tuple[Use, ...], logs: int, first_seed: int) -> str:
    """How many logs and which seeds, in words."""
    return f"{logs} logs of each of {len(uses)} kinds, seeds {first_seed} to {first_seed + logs - 1}"


def drawn(job: Job) -> Observations:
    log = simulate(job.use, np.random.default_rng(job.seed))
    return observe_frames(log.entries, log.modifications, unit=job.use.unit, capacity=job.use.capacity)[0]


def without_shift(use: Use) -> Use:
    return replace(use, shift_percent=0.0)


class OfAKind(Protocol):
    """A result that knows its kind of use."""

    @property
    def use(self) -> str: ...


Result = TypeVar("Result", bound=OfAKind)


def by_kind(results: Sequence[Result], uses: tuple[Use, ...]) -> dict[str, list[Result]]:
    """Results of each kind of use by name, and under `all` every one."""
    kinds = {use.vehicle: [one for one in results if one.use == use.vehicle] for use in uses}
    return {**kinds, ALL: list(results)}
