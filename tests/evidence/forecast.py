"""The distance needed, as told on the way, against the distance at which the same log got there."""

from __future__ import annotations

from collections.abc import Sequence

from tests.evidence import goals
from tests.evidence.block import Block
from tests.evidence.followed import FIRST_SEED, ON_THE_WAY, Followed, Told, question_of
from tests.evidence.goals import ALL, Promise
from tests.evidence.logs import by_kind, sample
from tests.evidence.measure import Measured, median, middle_80, proportion, resampled
from tests.uses import Use

HEADING = (
    "kind of use",
    "target",
    "told after, of the distance really needed",
    "logs that got there",
    "told / really needed",
    "goal",
    "verdict",
    "middle 80 % of logs",
    "80 % range held it",
    "goal",
    "verdict",
    "told: out of reach",
)
Pairs = list[tuple[float, Told]]  # km really needed, and what was told on the way


def promises(results: Sequence[Followed], uses: tuple[Use, ...]) -> list[Promise]:
    kinds = by_kind(results, uses).items()
    found = []
    for k, part in enumerate(ON_THE_WAY):
        told = {name: _typical(_pairs(of_kind, k)) for name, of_kind in kinds}
        found.append(Promise(f"distance told / really needed, told at {100 * part:.0f} % of it", goals.FORETOLD, told))
    for k, part in enumerate(ON_THE_WAY):
        held = {name: _held(_pairs(of_kind, k)) for name, of_kind in kinds}
        found.append(Promise(f"its 80 % range held it, told at {100 * part:.0f} %", goals.RANGE, held))
    return found


def block(results: Sequence[Followed], uses: tuple[Use, ...], logs: int) -> Block:
    targets = {use.vehicle: f"{100 * question_of(use).target:g} %" for use in uses} | {ALL: "-"}
    rows = [
        _row(name, targets[name], of_kind, k)
        for name, of_kind in by_kind(results, uses).items()
        for k in range(len(ON_THE_WAY))
    ]
    return Block("forecast", "", sample(uses, logs, FIRST_SEED), HEADING, tuple(rows))


def _row(name: str, target: str, results: Sequence[Followed], k: int) -> tuple[str, ...]:
    pairs = _pairs(results, k)
    typical, held = _typical(pairs), _held(pairs)
    return (
        name,
        target,
        f"{100 * ON_THE_WAY[k]:.0f} %",
        f"{len(pairs)} of {len(results)}",
        goals.FORETOLD.shown(typical),
        goals.FORETOLD.words,
        goals.FORETOLD.verdict(typical),
        middle_80(_ratios(pairs)),
        goals.RANGE.shown(held),
        goals.RANGE.words,
        goals.RANGE.verdict(held),
        str(sum(told.needed_km is None for _, told in pairs)),
    )


def _pairs(results: Sequence[Followed], k: int) -> Pairs:
    there = [(one.complete_km, one.told[k]) for one in results if one.complete_km is not None]
    return [(real, told) for real, told in there if told is not None]


def _ratios(pairs: Pairs) -> list[float]:
    """What was told to be out of reach counts as a distance longer than any."""
    return [float("inf") if told.needed_km is None else told.needed_km / real for real, told in pairs]


def _typical(pairs: Pairs) -> Measured | None:
    return resampled(median, _ratios(pairs))


def _held(pairs: Pairs) -> Measured | None:
    """An upper end beyond the horizon holds whatever comes; a range wholly beyond it does not."""
    return proportion(
        told.low_km is not None and told.low_km <= real and (told.high_km is None or real <= told.high_km)
        for real, told in pairs
    )
