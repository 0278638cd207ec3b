"""Rows of text as aligned columns. Standard library only."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence

from energytrack.presentation.plain import plain_text

GAP = "  "


def aligned(rows: Iterable[Sequence[str]], right: Sequence[int] = ()) -> list[str]:
    """One line a row; the columns numbered in `right` end on one line, the others start on one. Cells are made safe."""
    safe = [[plain_text(cell) for cell in row] for row in rows]
    widths = [max(map(cells_wide, column)) for column in zip(*safe, strict=True)]
    return [GAP.join(_padded(row, widths, right)).rstrip() for row in safe]


def cells_wide(text: str) -> int:
    """Terminal cells a text takes: none for combining marks, two for wide East Asian characters."""
    return sum(
        0 if unicodedata.combining(each) else 2 if unicodedata.east_asian_width(each) in "WF" else 1 for each in text
    )


def _padded(row: Sequence[str], widths: Sequence[int], right: Sequence[int]) -> Iterable[str]:
    for number, (cell, width) in enumerate(zip(row, widths, strict=True)):
        room = " " * (width - cells_wide(cell))
        yield room + cell if number in right else cell + room
