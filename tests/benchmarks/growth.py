"""Time and memory of `assess` as the log grows ten-fold: `python -m tests.benchmarks.growth SEGMENTS` runs one size."""

from __future__ import annotations

import json
import resource
import statistics
import sys
import time
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from energytrack.inference.assess import assess
from tests.benchmarks.timing import run
from tests.simulation import SimulatedLog, long_log

SIZES = (2_000, 20_000, 200_000)
TARGET = 12.0
_PER_MEBIBYTE = 1024**2 if sys.platform == "darwin" else 1024  # ru_maxrss counts bytes there, KiB elsewhere


@dataclass(frozen=True)
class Cost:
    """Of one `assess`: wall-clock seconds, and MiB above what the process held before it."""

    seconds: float
    mebibytes: float


def measure(segments: int) -> Cost:
    """In this process; best in one of its own."""
    _assess(long_log(100, np.random.default_rng(5)))  # loads and compiles everything, so that it is not counted
    log = long_log(segments, np.random.default_rng(5))
    before = _peak()
    start = time.perf_counter()
    _assess(log)
    return Cost(time.perf_counter() - start, _peak() - before)


def compare(rounds: int = 3) -> list[str]:
    """One line a size, each against the one ten times smaller."""
    found: dict[int, list[Cost]] = {size: [] for size in SIZES}
    for _ in range(rounds):
        for size in SIZES:
            found[size].append(Cost(**json.loads(run([sys.executable, "-m", __name__, str(size)]))))
    medians = {size: _median(costs) for size, costs in found.items()}
    lines = [f"assess, {size:,} segments: {c.seconds:.2f} s, {c.mebibytes:.0f} MiB" for size, c in medians.items()]
    for small, large in pairwise(SIZES):
        one, ten = medians[small], medians[large]
        time_ratio, memory_ratio = ten.seconds / one.seconds, ten.mebibytes / max(one.mebibytes, 0.1)
        lines.append(
            f"{large:,} / {small:,} segments: time {time_ratio:.1f} (target <= {TARGET:g}), "
            f"peak memory {memory_ratio:.1f}"
        )
    return lines


def _assess(log: SimulatedLog) -> None:
    assess(log.entries, log.modifications, "part", capacity=50.0, every_look=False, set_aside="none")


def _median(costs: list[Cost]) -> Cost:
    return Cost(statistics.median(c.seconds for c in costs), statistics.median(c.mebibytes for c in costs))


def _peak() -> float:
    """MiB held at most so far."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / _PER_MEBIBYTE


if __name__ == "__main__":
    cost = measure(int(sys.argv[1]))
    print(json.dumps({"seconds": cost.seconds, "mebibytes": cost.mebibytes}))
