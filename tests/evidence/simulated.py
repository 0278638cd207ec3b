"""All tables from simulated logs."""

from __future__ import annotations

from collections.abc import Iterator

from tests.evidence import coverage, false_alarms, followed, forecast, power, quantiles
from tests.evidence.block import Block
from tests.evidence.cores import across_cores
from tests.evidence.logs import jobs
from tests.uses import USES, Use

LOGS_AT_EACH_LOOK, LOGS_AT_ONE_LOOK, LOGS_FOLLOWED = 80, 200, 40


def blocks(uses: tuple[Use, ...] = USES, most: int | None = None) -> Iterator[Block]:
    """Each block as it is ready. most: fewer logs of each kind than the document's, for a try."""
    each, once, long = (min(logs, most or logs) for logs in (LOGS_AT_EACH_LOOK, LOGS_AT_ONE_LOOK, LOGS_FOLLOWED))
    yield quantiles.block()
    estimates = across_cores(coverage.estimate, jobs(uses, once, coverage.FIRST_SEED))
    yield coverage.block(estimates, uses, once)
    drifting = coverage.drifting_uses()
    estimates = across_cores(coverage.estimate, jobs(drifting, once, coverage.FIRST_SEED_OF_DRIFT))
    yield coverage.drift_block(estimates, drifting, once)
    claimed = across_cores(false_alarms.claims, jobs(uses, each, false_alarms.FIRST_SEED))
    yield false_alarms.block(claimed, uses, each)
    tests = across_cores(followed.follow, jobs(uses, long, followed.FIRST_SEED))
    yield power.block(tests, uses, long)
    yield forecast.block(tests, uses, long)
