"""The distance needed, as told early in a test, against the distance at which the same log got there."""

from __future__ import annotations

from collections.abc import Sequence

from tests.evidence.block import Block, rate, spread
from tests.evidence.followed import FIRST_SEED, TOLD_AFTER, Followed, Told
from tests.evidence.logs import sample
from tests.uses import Use

HEADING = (
    "kind of use",
    "told after, segments",
    "complete by then",
    "complete later",
    "never in the log",
    "told / really needed",
    "80 % range held it",
    "told: out of reach",
)


def block(results: Sequence[Followed], uses: tuple[Use, ...], logs: int) -> Block:
    rows = []
    for name in [*(use.vehicle for use in uses), "all"]:
        of_kind = [one for one in results if name in (one.use, "all")]
        rows += [_row(name, after, [(one, one.told[k]) for one in of_kind]) for k, after in enumerate(TOLD_AFTER)]
    return Block("forecast", "simulated", sample(uses, logs, FIRST_SEED), HEADING, tuple(rows))


def _row(name: str, after: int, pairs: Sequence[tuple[Followed, Told]]) -> tuple[str, ...]:
    still = [(one, told) for one, told in pairs if not told.already]
    later = [(one.complete_km, told) for one, told in still if one.complete_km is not None]
    return (
        name,
        str(after),
        str(len(pairs) - len(still)),
        str(len(later)),
        str(len(still) - len(later)),
        spread(told.needed_km / real for real, told in later if told.needed_km is not None),
        rate(_held(real, told) for real, told in later),
        str(sum(told.needed_km is None for _, told in later)),
    )


def _held(real_km: float, told: Told) -> bool:
    """An upper end beyond the horizon holds whatever comes; a range wholly beyond it does not."""
    return told.low_km is not None and told.low_km <= real_km and (told.high_km is None or real_km <= told.high_km)
