"""Time two processes against each other."""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from tests.documents import ROOT

Command = Sequence[str]
HELLO = """
import typer
app = typer.Typer(add_completion=False, rich_markup_mode=None)
@app.command()
def hello(name: str) -> None:
    print("hello", name)
app()
"""


@dataclass(frozen=True)
class Comparison:
    """Median wall-clock seconds of a command and of its baseline, run in turns."""

    name: str
    seconds: float
    baseline: str
    baseline_seconds: float
    target: float

    @property
    def ratio(self) -> float:
        return self.seconds / self.baseline_seconds

    def __str__(self) -> str:
        times = f"{1000 * self.seconds:.0f} ms / {1000 * self.baseline_seconds:.0f} ms"
        return f"{self.name} / {self.baseline}: {times} = {self.ratio:.2f} (target <= {self.target:g})"


def compare(
    name: str,
    command: Callable[[int], Command],
    baseline: str,
    baseline_command: Command,
    *,
    target: float,
    rounds: int,
) -> Comparison:
    """Run both in turns, so that a busy machine slows both. command: of the round, for what can be done only once."""
    spent: tuple[list[float], list[float]] = ([], [])
    seconds_of(baseline_command), seconds_of(command(0))  # fills the file cache and compiles
    for turn in range(1, rounds + 1):
        spent[1].append(seconds_of(baseline_command))
        spent[0].append(seconds_of(command(turn)))
    return Comparison(name, statistics.median(spent[0]), baseline, statistics.median(spent[1]), target)


def seconds_of(command: Command) -> float:
    """Wall-clock time of one process that must succeed."""
    start = time.perf_counter()
    run(command)
    return time.perf_counter() - start


def run(command: Command) -> str:
    """The output of a process of this project. Raises CalledProcessError where it fails."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    environment.pop("PYTHONDONTWRITEBYTECODE", None)  # an installed package has its bytecode beside it
    return subprocess.run(command, env=environment, capture_output=True, text=True, check=True).stdout


def energytrack(*words: str) -> Command:
    """The command line as its console script runs it."""
    return [sys.executable, "-c", "from energytrack.cli.app import main; main()", *words]
