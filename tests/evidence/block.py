"""A measured table: what stands between two markers of the document."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

COMMAND = "python -m tests.evidence"


@dataclass(frozen=True)
class Block:
    """Rows of cells under a heading, with what it takes to get them again."""

    name: str
    options: str  # of the command
    sample: str  # counts and seeds
    heading: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]

    def __post_init__(self) -> None:
        wrong = [row for row in self.rows if len(row) != len(self.heading)]
        if wrong:
            raise ValueError(f"{self.name}: a row does not fit the heading: {wrong[0]}")

    def markdown(self) -> str:
        lines = [_line(self.heading), _line(["---"] * len(self.heading)), *map(_line, self.rows)]
        return "\n".join([*lines, "", f"`{f'{COMMAND} {self.options}'.strip()}`: {self.sample}."])


def _line(cells: Sequence[str]) -> str:
    return f"| {' | '.join(cells)} |"
