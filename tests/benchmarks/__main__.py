"""`python -m tests.benchmarks`: each figure as a ratio to a baseline measured in the same run."""

from __future__ import annotations

import tempfile
from itertools import chain
from pathlib import Path

from tests.benchmarks import answers, fleets, growth, partitions, processes


def benchmarks() -> None:
    """Print one line a figure, as each is ready."""
    with tempfile.TemporaryDirectory() as folder:
        logbook = processes.write_logbook(Path(folder))
        print(processes.describe(logbook), flush=True)
        print(processes.enough(logbook), flush=True)
        print(processes.review(logbook), flush=True)
        print(processes.fillup(logbook), flush=True)
        print(processes.rehearse(Path(folder) / "rehearsed"), flush=True)
    for line in chain(answers.answers(), partitions.compare(), growth.compare(), fleets.fleets()):
        print(line, flush=True)


if __name__ == "__main__":
    benchmarks()
