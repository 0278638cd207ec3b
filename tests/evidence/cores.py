"""Many independent runs on both cores."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from typing import TypeVar

CORES = 2
FEW = 30  # jobs not worth starting processes for
Job = TypeVar("Job")
Result = TypeVar("Result")


def across_cores(work: Callable[[Job], Result], jobs: Sequence[Job]) -> list[Result]:
    """Results in the order of the jobs. One thread of linear algebra a process: the matrices are small."""
    if len(jobs) <= FEW:
        return [work(job) for job in jobs]
    os.environ["OPENBLAS_NUM_THREADS"] = "1"
    with ProcessPoolExecutor(CORES, mp_context=get_context("spawn")) as pool:  # numpy is loaded after the line above
        return list(pool.map(work, jobs, chunksize=1 + len(jobs) // 100))
