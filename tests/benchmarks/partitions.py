"""The exact search for several breaks against a general-purpose library's, in one process and in turns."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import TypeVar

import numpy as np
import ruptures

from energytrack.inference.regimes.search import partitions

SEGMENTS, LONG = 2_000, 20_000
BREAKS, SHARE = 5, 0.05  # of the series, for the shortest regime
TARGET = 20.0
Value = TypeVar("Value")


def a_series(n: int) -> tuple[np.ndarray, np.ndarray]:
    """Consumption that answers to temperature and speed, with five breaks of 0.6 to 1 residual sd."""
    rng = np.random.default_rng(0)
    columns = np.column_stack([np.ones(n), rng.normal(10, 5, n), rng.normal(80, 8, n)])
    y = columns @ [5.0, 0.1, 0.02] + rng.normal(0, 0.5, n)
    for place, step in zip((0.2, 0.4, 0.5, 0.7, 0.85), (0.3, -0.4, 0.5, -0.3, 0.4), strict=True):
        y[int(place * n) :] += step
    return y, columns


def compare(n: int = SEGMENTS) -> list[str]:
    """Both on one series, then ours alone on a long one."""
    y, columns = a_series(n)
    shortest = int(SHARE * n)
    partitions(y[:100], columns[:100], most=1, shortest=10)  # loads everything, so that it is not counted
    seconds, found = _timed(lambda: partitions(y, columns, most=BREAKS, shortest=shortest))
    theirs, expected = _timed(lambda: _theirs(y, columns, shortest))
    same = "the same breaks" if list(found[BREAKS].breaks) == expected else "OTHER BREAKS"
    long_y, long_columns = a_series(LONG)
    long, _ = _timed(lambda: partitions(long_y, long_columns, most=BREAKS, shortest=int(SHARE * LONG)))
    return [
        f"ruptures Dynp / partitions, {n:,} segments, {columns.shape[1]} parameters, {BREAKS} breaks: "
        f"{theirs:.1f} s / {1000 * seconds:.0f} ms = {theirs / seconds:.0f} (target >= {TARGET:g}), {same}",
        f"partitions, {LONG:,} segments: {long:.1f} s",
    ]


def _theirs(y: np.ndarray, columns: np.ndarray, shortest: int) -> list[int]:
    search = ruptures.Dynp(model="linear", min_size=shortest, jump=1).fit(np.column_stack([y, columns]))
    breaks: list[int] = search.predict(n_bkps=BREAKS)[:-1]
    return breaks


def _timed(work: Callable[[], Value]) -> tuple[float, Value]:
    start = time.perf_counter()
    value = work()
    return time.perf_counter() - start, value


if __name__ == "__main__":
    print("\n".join(compare()))
