"""Many independent computations, here or spread over an executor, in an order that never changes the result."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import Executor, as_completed
from typing import TypeVar

Job = TypeVar("Job")
Done = TypeVar("Done")
Progress = Callable[[int, int], None]  # called with how many are done, and of how many


def run_all(
    function: Callable[[Job], Done],
    jobs: Sequence[Job],
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> list[Done]:
    """The result of each job, in the order of the jobs. What has not begun is cancelled when one fails."""
    tell = progress or (lambda done, of: None)
    tell(0, len(jobs))
    if executor is None:
        results = []
        for number, job in enumerate(jobs, start=1):
            results.append(function(job))
            tell(number, len(jobs))
        return results
    futures = [executor.submit(function, job) for job in jobs]
    try:
        for number, future in enumerate(as_completed(futures), start=1):
            future.result()
            tell(number, len(jobs))
    except BaseException:
        for future in futures:
            future.cancel()
        raise
    return [future.result() for future in futures]
