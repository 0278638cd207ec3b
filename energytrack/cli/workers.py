"""Worker processes for long computations: one a core, one thread each, silent on Ctrl-C."""

from __future__ import annotations

import multiprocessing
import os
import signal
from collections.abc import Iterator
from concurrent.futures import Executor, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager

from energytrack.errors import EnergytrackError


@contextmanager
def workers() -> Iterator[Executor]:
    """An executor over all cores, each worker with the one thread that `app.main` has set."""
    count = _cores()
    pool = ProcessPoolExecutor(count, multiprocessing.get_context("spawn"), _ignore_interrupts)
    heard = signal.signal(signal.SIGINT, signal.SIG_IGN)  # inherited, so that a starting worker stays silent too
    for _ in range(count):
        pool.submit(os.getpid)
    signal.signal(signal.SIGINT, heard)
    try:
        yield pool
    except KeyboardInterrupt:
        _ignore_interrupts()  # a second one must not disturb the end
        for worker in multiprocessing.active_children():
            worker.terminate()
        raise
    except BrokenProcessPool as fault:
        raise EnergytrackError("a worker process was ended from outside: run the command again") from fault
    finally:
        pool.shutdown(cancel_futures=True)


def _cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _ignore_interrupts() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)
