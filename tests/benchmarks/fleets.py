"""A fleet's month: two worker processes against one, and all of 1,000 vehicles of 100 entries."""

from __future__ import annotations

import multiprocessing
import os
import time
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor

from energytrack.inference.fleet.assess_fleet import assess_fleet
from energytrack.inference.fleet.logs import VehicleLog
from tests.fleets import fleet

VEHICLES, ENTRIES, SAMPLE = 1_000, 100, 200
LEAST_GAIN, MOST_SECONDS, MOST_MIB = 1.7, 60.0, 1_024
MONTH = "2024-11"


def fleets(*, whole: bool = True) -> Iterator[str]:
    """One line a figure."""
    os.environ["OPENBLAS_NUM_THREADS"] = "1"  # of the workers
    sample = fleet(SAMPLE, entries=ENTRIES)
    one, two = _seconds(sample, 1), _seconds(sample, 2)
    yield (
        f"fleet, {SAMPLE} vehicles of {ENTRIES} entries, one worker / two: {one:.1f} s / {two:.1f} s = {one / two:.2f} "
        f"(target >= {LEAST_GAIN:g})"
    )
    if whole:
        spent = _seconds(fleet(VEHICLES, entries=ENTRIES), 2)
        all_of_it = f"fleet, {VEHICLES} vehicles of {ENTRIES} entries, two workers"
        yield f"{all_of_it}: {spent:.0f} s (target <= {MOST_SECONDS:g})"
        memory = _peak()
        if memory is not None:
            yield f"fleet, most memory of this process and two workers: {memory:.0f} MiB (target <= {MOST_MIB})"


def _seconds(logs: list[VehicleLog], workers: int) -> float:
    with ProcessPoolExecutor(workers, multiprocessing.get_context("spawn")) as pool:
        list(pool.map(_loaded, range(4 * workers)))  # libraries are imported before the clock starts
        begun = time.perf_counter()
        assess_fleet(logs, month=MONTH, executor=pool)
        return time.perf_counter() - begun


def _loaded(number: int) -> int:
    import energytrack.inference.fleet.vehicle  # noqa: F401

    time.sleep(0.2)  # so that every worker gets its share
    return number


def _peak() -> float | None:
    """MiB; None where the platform does not tell."""
    try:
        import resource
    except ImportError:
        return None
    own, child = (resource.getrusage(who).ru_maxrss / 1024 for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN))
    return own + 2 * child
