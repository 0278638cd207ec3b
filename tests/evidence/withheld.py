"""Verdicts before and after they are held against changes nobody declared: what is lost, and what is prevented."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from energytrack.inference.looks import finding, take_looks
from energytrack.inference.undeclared import Logged, inside, undeclared
from tests.evidence.block import Block
from tests.evidence.logs import QUESTION, Job, by_kind, drawn, sample, without_shift
from tests.evidence.measure import rate
from tests.uses import Use

FIRST_SEED = 70_000
SHIFT, CHANGE = -6.0, 0.90
LATER = 0.2  # of the test, driven before the change that nobody declared
HEADING = (
    "kind of use",
    "no shift: called shifted, before",
    "after",
    f"true shift of {abs(SHIFT):g} %: called shifted, before",
    "after",
    f"no shift, {100 * (1 - CHANGE):.0f} % less from {100 * LATER:.0f} % of the test on: called shifted, before",
    "after",
)


@dataclass(frozen=True)
class Verdicts:
    """Whether a shift is called on one log, without the search and with it."""

    use: str
    still: tuple[bool, bool]
    shifted: tuple[bool, bool]
    changed: tuple[bool, bool]


def verdicts(job: Job) -> Verdicts:
    still = Job(without_shift(job.use), job.seed)
    return Verdicts(
        job.use.vehicle,
        _called(still),
        _called(Job(replace(job.use, shift_percent=SHIFT), job.seed)),
        _called(still, changed=True),
    )


def _called(job: Job, *, changed: bool = False) -> tuple[bool, bool]:
    observed = drawn(job)
    if changed:
        start = int(np.flatnonzero(observed.fitted[:, 0])[0])
        later = np.arange(len(observed)) >= start + LATER * (len(observed) - start)
        observed = replace(observed, energy=np.where(later, CHANGE, 1.0) * observed.energy)
    states = take_looks(observed, QUESTION, every=True)
    found = finding(states, QUESTION.target)
    if found is None or found[0] != "shifted":
        return False, False
    against = undeclared(states[-1].model, QUESTION, Logged((), ()))
    return True, not inside(against, found[1])


def block(results: list[Verdicts], uses: tuple[Use, ...], logs: int) -> Block:
    rows = tuple(_row(name, of_kind) for name, of_kind in by_kind(results, uses).items())
    return Block("withheld", "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _row(name: str, results: list[Verdicts]) -> tuple[str, ...]:
    cases = [[getattr(one, case) for one in results] for case in ("still", "shifted", "changed")]
    return (name, *(rate(pair[after] for pair in pairs) for pairs in cases for after in (0, 1)))
