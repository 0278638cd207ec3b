"""A measured table: what stands between two markers of the document."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from statsmodels.stats.proportion import proportion_confint

COMMAND = "python -m tests.evidence"


@dataclass(frozen=True)
class Block:
    """Rows of cells under a heading, with what it takes to get them again."""

    name: str
    command: str
    sample: str  # counts and seeds
    heading: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]

    def __post_init__(self) -> None:
        wrong = [row for row in self.rows if len(row) != len(self.heading)]
        if wrong:
            raise ValueError(f"{self.name}: a row does not fit the heading: {wrong[0]}")

    def markdown(self) -> str:
        lines = [_line(self.heading), _line(["---"] * len(self.heading)), *map(_line, self.rows)]
        return "\n".join([*lines, "", f"`{COMMAND} {self.command}`: {self.sample}."])


def _line(cells: Sequence[str]) -> str:
    return f"| {' | '.join(cells)} |"


def rate(happened: Iterable[bool], independent: int | None = None) -> str:
    """A share in percent with its 95 % sampling range (Wilson, 1927), or a dash where nothing was counted.

    independent: how many of the trials are, where fewer than all; the range is that of so many trials.
    """
    trials = np.array(list(happened), dtype=float)
    if trials.size == 0:
        return "-"
    count = independent or trials.size
    low, high = proportion_confint(trials.mean() * count, count, method="wilson")
    return f"{100 * trials.mean():.0f} % [{100 * low:.0f}, {100 * high:.0f}]"


def middle(values: Iterable[float], digits: int = 0) -> str:
    """Median, or a dash where there is none."""
    found = list(values)
    return f"{np.median(found):,.{digits}f}" if found else "-"


def spread(values: Iterable[float], digits: int = 2) -> str:
    """Median and the range from the 10th to the 90th percentile, or a dash."""
    found = list(values)
    if not found:
        return "-"
    low, half, high = np.quantile(found, [0.1, 0.5, 0.9])
    return f"{half:.{digits}f} [{low:.{digits}f}, {high:.{digits}f}]"
