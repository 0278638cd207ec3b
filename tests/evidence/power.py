"""A true shift as large as the target: is it found by the time the information is complete, as promised?"""

from __future__ import annotations

from collections.abc import Sequence

from tests.evidence.block import Block, middle, rate
from tests.evidence.followed import FIRST_SEED, Ending, Followed
from tests.evidence.logs import sample
from tests.uses import Use

HEADING = (
    "kind of use",
    "tests that closed",
    "of these, found it",
    "median km when closed",
    "without the price: closed",
    "of these, found it",
    "Student's t: closed",
    "of these, found it",
    "median km when closed",
    "range held the truth at every look",
)


def block(results: Sequence[Followed], uses: tuple[Use, ...], logs: int) -> Block:
    rows = [_row(use.vehicle, [one for one in results if one.use == use.vehicle]) for use in uses]
    text = sample(uses, logs, FIRST_SEED)
    return Block("power", "simulated", text, HEADING, (*rows, _row("all", results)))


def _row(name: str, results: Sequence[Followed]) -> tuple[str, ...]:
    ours, student = [one.ours for one in results], [one.student for one in results]
    return (
        name,
        *_closed(ours),
        _km(ours),
        *_closed([one.unpriced for one in results]),
        *_closed(student),
        _km(student),
        rate(one.held for one in results),
    )


def _km(endings: Sequence[Ending | None]) -> str:
    return middle(ending.driven_km for ending in endings if ending is not None)


def _closed(endings: Sequence[Ending | None]) -> tuple[str, str]:
    closed = [ending for ending in endings if ending is not None]
    return f"{len(closed)} of {len(endings)}", rate(ending.found for ending in closed)
