"""A true shift as large as the target: is it found by the time the information is complete, as promised?"""

from __future__ import annotations

from collections.abc import Sequence

from tests.evidence import goals
from tests.evidence.block import Block
from tests.evidence.followed import FIRST_SEED, Ending, Followed, question_of
from tests.evidence.goals import ALL, Promise
from tests.evidence.logs import by_kind, sample
from tests.evidence.measure import Measured, middle, proportion, rate
from tests.uses import Use

HEADING = (
    "kind of use",
    "target and shift",
    "tests that closed",
    "of these, found it",
    "goal",
    "verdict",
    "median km when closed",
    "without the price: closed",
    "of these, found it",
    "Student's t: closed",
    "of these, found it",
    "median km when closed",
    "range held the truth until the close",
    "goal",
    "verdict",
)


def promises(results: Sequence[Followed], uses: tuple[Use, ...]) -> list[Promise]:
    kinds = by_kind(results, uses).items()
    found = {name: _found([one.ours for one in of_kind]) for name, of_kind in kinds}
    held = {name: proportion(one.held for one in of_kind) for name, of_kind in kinds}
    return [
        Promise("a shift as large as the target is found by the close", goals.FOUND, found),
        Promise("the look-proof range holds the truth at every look until the close", goals.COVERAGE, held),
    ]


def block(results: Sequence[Followed], uses: tuple[Use, ...], logs: int) -> Block:
    targets = {use.vehicle: f"{100 * question_of(use).target:g} %" for use in uses} | {ALL: "-"}
    rows = tuple(_row(name, targets[name], of_kind) for name, of_kind in by_kind(results, uses).items())
    return Block("power", "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _row(name: str, target: str, results: Sequence[Followed]) -> tuple[str, ...]:
    ours, student = [one.ours for one in results], [one.student for one in results]
    held = proportion(one.held for one in results)
    return (
        name,
        target,
        *_closed(ours),
        goals.FOUND.words,
        goals.FOUND.verdict(_found(ours)),
        _km(ours),
        *_closed([one.unpriced for one in results]),
        *_closed(student),
        _km(student),
        goals.COVERAGE.shown(held),
        goals.COVERAGE.words,
        goals.COVERAGE.verdict(held),
    )


def _found(endings: Sequence[Ending | None]) -> Measured | None:
    return proportion(ending.found for ending in endings if ending is not None)


def _km(endings: Sequence[Ending | None]) -> str:
    return middle(ending.driven_km for ending in endings if ending is not None)


def _closed(endings: Sequence[Ending | None]) -> tuple[str, str]:
    closed = [ending for ending in endings if ending is not None]
    return f"{len(closed)} of {len(endings)}", rate(ending.found for ending in closed)
