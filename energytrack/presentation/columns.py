"""Rows of text as aligned columns. Standard library only."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence

from energytrack.presentation.plain import plain_text

GAP = "  "
_LEAST_ROOM = 20  # cells, for text behind other columns


def aligned(rows: Iterable[Sequence[str]], right: Sequence[int] = ()) -> list[str]:
    """One line a row; the columns numbered in `right` end on one line, the others start on one. Cells are made safe."""
    safe = [[plain_text(cell) for cell in row] for row in rows]
    widths = [max(map(cells_wide, column)) for column in zip(*safe, strict=True)]
    return [GAP.join(_padded(row, widths, right)).rstrip() for row in safe]


def folded(heads: Sequence[str], ends: Sequence[str], width: int) -> list[str]:
    """Each head with its end behind it, in lines of at most `width` cells: a long end goes on under itself.

    Where the widest head leaves too little room, ends go on near the left margin.
    """
    start = max((cells_wide(head) for head in heads), default=0) + len(GAP)
    margin = start if width - start >= _LEAST_ROOM else len(GAP)
    lines: list[str] = []
    for head, end in zip(heads, ends, strict=True):
        line = head + " " * (start - cells_wide(head))
        for word in _words(plain_text(end), width - margin):
            if line.strip() and cells_wide(line.rstrip()) + 1 + cells_wide(word) > width:
                lines.append(line.rstrip())
                line = " " * margin
            line += word + " "
        lines.append(line.rstrip())
    return lines


def _words(text: str, width: int) -> Iterable[str]:
    """The words of a text, those wider than `width` cells cut up."""
    for word in text.split(" "):
        piece = ""
        for each in word:
            if cells_wide(piece + each) > width:
                yield piece
                piece = ""
            piece += each
        if piece:
            yield piece


def cells_wide(text: str) -> int:
    """Terminal cells a text takes: none for combining marks, two for wide East Asian characters."""
    return sum(
        0 if unicodedata.combining(each) else 2 if unicodedata.east_asian_width(each) in "WF" else 1 for each in text
    )


def _padded(row: Sequence[str], widths: Sequence[int], right: Sequence[int]) -> Iterable[str]:
    for number, (cell, width) in enumerate(zip(row, widths, strict=True)):
        room = " " * (width - cells_wide(cell))
        yield room + cell if number in right else cell + room
