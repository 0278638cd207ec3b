"""No shift at all, and a look after every entry: how often is one claimed?"""

from __future__ import annotations

from dataclasses import dataclass

from energytrack.inference.looks import finding, take_looks
from tests.evidence import goals, usual
from tests.evidence.block import Block
from tests.evidence.goals import Promise
from tests.evidence.logs import QUESTION, Job, by_kind, drawn, sample, without_shift
from tests.evidence.measure import Measured, proportion, rate
from tests.uses import Use

FIRST_SEED = 1_000
HEADING = (
    "kind of use",
    "two averages, each look",
    "two averages, once",
    "regression, once",
    "energytrack, each look",
    "goal",
    "verdict",
    "range held zero at every look",
)


@dataclass(frozen=True)
class Claims:
    """Who claimed a shift on one log without any."""

    use: str
    averages_each_look: bool
    averages_once: bool
    regression_once: bool
    ours: bool
    held: bool  # zero lay in the look-proof range of every look, later ones included


def claims(job: Job) -> Claims:
    observed = drawn(Job(without_shift(job.use), job.seed))
    states = take_looks(observed, QUESTION, every=True)
    found = finding(states, QUESTION.target)
    return Claims(
        job.use.vehicle,
        usual.averages_ever_differ(observed),
        usual.averages_differ(observed),
        usual.regression_differs(states[-1].model),
        found is not None and found[0] == "shifted",
        all(state.interval is None or state.interval[0] <= 0 <= state.interval[1] for state in states),
    )


def promises(results: list[Claims], uses: tuple[Use, ...]) -> list[Promise]:
    measured = {name: _ours(of_kind) for name, of_kind in by_kind(results, uses).items()}
    return [Promise("false alarms, with a look after every entry", goals.FALSE_ALARMS, measured)]


def block(results: list[Claims], uses: tuple[Use, ...], logs: int) -> Block:
    rows = tuple(_row(name, of_kind) for name, of_kind in by_kind(results, uses).items())
    return Block("false alarms", "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _ours(results: list[Claims]) -> Measured | None:
    return proportion(one.ours for one in results)


def _row(name: str, results: list[Claims]) -> tuple[str, ...]:
    return (
        name,
        rate(one.averages_each_look for one in results),
        rate(one.averages_once for one in results),
        rate(one.regression_once for one in results),
        rate(one.ours for one in results),
        goals.FALSE_ALARMS.words,
        goals.FALSE_ALARMS.verdict(_ours(results)),
        rate(one.held for one in results),
    )
