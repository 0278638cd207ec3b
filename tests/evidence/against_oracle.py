"""The error of the estimate against that of an oracle which knows the noise, on the same logs."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tests.evidence import goals
from tests.evidence.block import Block
from tests.evidence.coverage import FIRST_SEED, Estimate
from tests.evidence.goals import ALL, Promise
from tests.evidence.logs import by_kind, sample
from tests.evidence.measure import Array, Measured, resampled, rms
from tests.uses import Use

HEADING = (
    "kind of use",
    "RMSE, %",
    "RMSE of the oracle, %",
    "ratio of the two",
    "goal",
    "verdict",
    "RMSE of the oracle / its own standard error",
)


def promises(results: Sequence[Estimate], uses: tuple[Use, ...]) -> list[Promise]:
    ratios = {name: _ratio(of_kind) for name, of_kind in by_kind(results, uses).items()}
    return [Promise("error of the estimate / error of an oracle", goals.ERROR, ratios)]


def block(results: Sequence[Estimate], uses: tuple[Use, ...], logs: int) -> Block:
    rows = tuple(_row(name, of_kind) for name, of_kind in by_kind(results, uses).items())
    return Block("oracle", "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _row(name: str, results: Sequence[Estimate]) -> tuple[str, ...]:
    ours, theirs, believed = _errors(results)
    ratio = _ratio(results)
    return (
        name,
        "-" if name == ALL else f"{rms(ours):.2f}",  # kinds of different noise have no RMSE in common
        "-" if name == ALL else f"{rms(theirs):.2f}",
        goals.ERROR.shown(ratio),
        goals.ERROR.words,
        goals.ERROR.verdict(ratio),
        f"{rms(theirs / believed):.2f}",
    )


def _ratio(results: Sequence[Estimate]) -> Measured | None:
    """Of the root mean square errors. Each kind's errors count in the usual standard error of its oracle."""
    ours, theirs, believed = _errors(results)
    kinds = np.array([one.use for one in results])
    usual = np.array([believed[kinds == kind].mean() for kind in kinds])
    return resampled(lambda a, b: rms(a) / rms(b), ours / usual, theirs / usual)


def _errors(results: Sequence[Estimate]) -> tuple[Array, Array, Array]:
    """Ours, the oracle's, and the oracle's standard errors (n,)."""
    rows = [(one.error, one.oracle_error, one.oracle_standard_error) for one in results]
    ours, theirs, believed = np.array(rows, dtype=float).reshape(-1, 3).T
    return ours, theirs, believed
