"""All tables from simulated logs, in parts that can be measured one by one."""

from __future__ import annotations

from collections.abc import Iterator

from tests.evidence import coverage, false_alarms, followed, forecast, power, quantiles
from tests.evidence.block import Block
from tests.evidence.cores import across_cores
from tests.evidence.logs import jobs
from tests.uses import Use

Uses = tuple[Use, ...]


def _quantiles(uses: Uses, most: int | None) -> Iterator[Block]:
    yield quantiles.block()


def _coverage(uses: Uses, most: int | None) -> Iterator[Block]:
    logs = _at_most(200, most)
    estimates = across_cores(coverage.estimate, jobs(uses, logs, coverage.FIRST_SEED))
    yield coverage.block(estimates, uses, logs)


def _drift(uses: Uses, most: int | None) -> Iterator[Block]:
    logs, uses = _at_most(200, most), coverage.drifting_uses()
    estimates = across_cores(coverage.estimate, jobs(uses, logs, coverage.FIRST_SEED_OF_DRIFT))
    yield coverage.drift_block(estimates, uses, logs)


def _false_alarms(uses: Uses, most: int | None) -> Iterator[Block]:
    logs = _at_most(80, most)
    yield false_alarms.block(
        across_cores(false_alarms.claims, jobs(uses, logs, false_alarms.FIRST_SEED)), uses, logs
    )


def _long_tests(uses: Uses, most: int | None) -> Iterator[Block]:
    logs = _at_most(24, most)
    tests = across_cores(followed.follow, jobs(uses, logs, followed.FIRST_SEED))
    yield power.block(tests, uses, logs)
    yield forecast.block(tests, uses, logs)


PARTS = {
    "quantiles": _quantiles,
    "coverage": _coverage,
    "drift": _drift,
    "false-alarms": _false_alarms,
    "long-tests": _long_tests,
}


def _at_most(logs: int, most: int | None) -> int:
    return min(logs, most or logs)
