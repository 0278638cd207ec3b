"""The jobs of all parts on every core there is."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from typing import Any

import numpy as np

from energytrack.inference.jobs import run_all
from energytrack.presentation.progress import progress
from tests.evidence.parts import Part


def measured(chosen: Sequence[Part]) -> list[list[Any]]:
    """Results of each part, in the order of its jobs.

    The jobs of all parts are mixed, so that the time left is well estimated all along.
    """
    tasks = [(part.work, job) for part in chosen for job in part.jobs]
    order = np.random.default_rng(0).permutation(len(tasks)).tolist()
    os.environ["OPENBLAS_NUM_THREADS"] = "1"  # small matrices: one thread each; numpy loads anew in each process
    with ProcessPoolExecutor(mp_context=get_context("spawn")) as pool, progress("measuring") as tell:
        mixed = run_all(_done, [tasks[k] for k in order], pool, tell)
    by_place = dict(zip(order, mixed, strict=True))
    found = iter([by_place[k] for k in range(len(tasks))])
    return [[next(found) for _ in part.jobs] for part in chosen]


def _done(task: tuple[Callable[[Any], Any], Any]) -> Any:
    work, job = task
    return work(job)
