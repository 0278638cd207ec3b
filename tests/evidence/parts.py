"""The parts of the evidence: what is computed, job by job, and the tables its results make."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from tests.evidence import (
    against_oracle,
    controls,
    coverage,
    false_alarms,
    followed,
    forecast,
    goals,
    power,
    quantiles,
    sham,
    undeclared,
    watching,
    withheld,
)
from tests.evidence.block import Block
from tests.evidence.goals import Promise
from tests.evidence.logs import jobs
from tests.uses import Use

Uses = tuple[Use, ...]
LOGS, LONG_LOGS, SEARCHED_LOGS = 200, 100, 40  # of each kind


@dataclass(frozen=True)
class Part:
    """Independent jobs, the function that does one, and what their results (in the order of the jobs) say."""

    work: Callable[[Any], Any]
    jobs: Sequence[Any]
    blocks: Callable[[Any], list[Block]]
    promises: Callable[[Any], list[Promise]] = lambda results: []


def simulated(uses: Uses, most: int | None) -> list[Part]:
    """Logs drawn from a known truth, at most so many of each kind where `most` is given."""
    logs, long_logs, searched = (min(usual, most or usual) for usual in (LOGS, LONG_LOGS, SEARCHED_LOGS))
    runs = min(controls.LOGS, most or controls.LOGS)
    drifting, commutes = coverage.drifting_uses(), undeclared.drifting_uses()
    return [
        Part(
            false_alarms.claims,
            jobs(uses, logs, false_alarms.FIRST_SEED),
            lambda found: [false_alarms.block(found, uses, logs)],
            lambda found: false_alarms.promises(found, uses),
        ),
        Part(
            coverage.estimate,
            jobs(uses, logs, coverage.FIRST_SEED),
            lambda found: [coverage.block(found, uses, logs), against_oracle.block(found, uses, logs)],
            lambda found: [*coverage.promises(found, uses), *against_oracle.promises(found, uses)],
        ),
        Part(
            coverage.estimate,
            jobs(drifting, logs, coverage.FIRST_SEED_OF_DRIFT),
            lambda found: [coverage.drift_block(found, drifting, logs)],
        ),
        Part(
            followed.follow,
            jobs(uses, long_logs, followed.FIRST_SEED),
            lambda found: [power.block(found, uses, long_logs), forecast.block(found, uses, long_logs)],
            lambda found: [*power.promises(found, uses), *forecast.promises(found, uses)],
        ),
        Part(controls.compare, controls.jobs(runs), lambda found: [controls.block(found, runs)]),
        Part(
            undeclared.reports,
            jobs(uses, searched, undeclared.FIRST_SEED),
            lambda found: [undeclared.block("undeclared", found, uses, searched)],
        ),
        Part(
            undeclared.reports,
            jobs(commutes, searched, undeclared.FIRST_SEED),
            lambda found: [undeclared.block("undeclared, drift", found, commutes, searched)],
        ),
        Part(
            withheld.verdicts,
            jobs(uses, searched, withheld.FIRST_SEED),
            lambda found: [withheld.block(found, uses, searched)],
        ),
        Part(
            watching.watch,
            jobs(uses, min(watching.LOGS, logs), watching.FIRST_SEED),
            lambda found: [watching.block(found, uses, min(watching.LOGS, logs))],
        ),
    ]


def real(folder: Path) -> list[Part]:
    """Sham changes in the logs of a folder. Raises ValueError where none is long enough."""
    logs = sham.logs_of(folder)
    return [Part(sham.claims, sham.all_cuts(logs), lambda found: sham.blocks(found, logs))]


def blocks(parts: Sequence[Part], results: Sequence[list[Any]]) -> list[Block]:
    """Every table, the goals of the simulated logs first."""
    each = list(zip(parts, results, strict=True))
    promises = [promise for part, found in each for promise in part.promises(found)]
    tables = [block for part, found in each for block in part.blocks(found)]
    sample = "the samples of the tables below"
    return [goals.block("goals on simulated logs", "", sample, promises), quantiles.block(), *tables]
