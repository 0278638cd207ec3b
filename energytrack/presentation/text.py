"""Lines on a terminal: broken between words, never inside a figure."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from rich.cells import cell_len, chop_cells

HARD_SPACE = "\u00a0"  # joins a figure to its unit while a line is broken; printed as a plain space
LABEL_WIDTH = 22


def join(figure: str) -> str:
    """A figure and its unit as one word."""
    return figure.replace(" ", HARD_SPACE)


def wrap(text: str, width: int, indent: str = "") -> list[str]:
    """Lines of at most `width` terminal cells; all but the first start with `indent`."""
    lines: list[str] = []
    line = ""
    for word in _pieces(text, width - cell_len(indent)):
        if line.strip() and cell_len(line) + 1 + cell_len(word) > width:
            lines.append(line)
            line = indent + word
        else:
            line = f"{line} {word}" if line.strip() else line + word
    return [done.replace(HARD_SPACE, " ") for done in [*lines, line]]


def _pieces(text: str, width: int) -> Iterable[str]:
    """The words of a text, those wider than a whole line cut up."""
    for word in text.split(" "):
        if cell_len(word) > width:
            yield from chop_cells(word.replace(HARD_SPACE, " "), width)
        elif word:
            yield word


def labelled(rows: Sequence[tuple[str, str]], width: int) -> list[str]:
    """Rows of a label and its value; a long value goes on under itself, a long label stands above it."""
    lines: list[str] = []
    for label, value in rows:
        margin = " " * LABEL_WIDTH
        body = wrap(value, width - LABEL_WIDTH)
        if cell_len(label) < LABEL_WIDTH:
            lines.append((label + " " * (LABEL_WIDTH - cell_len(label)) + body.pop(0)).rstrip())
        else:
            lead = " " * (len(label) - len(label.lstrip()))
            lines += [lead + line for line in wrap(label.lstrip(), width - len(lead))]
        lines += [margin + line for line in body]
    return lines


def bullets(texts: Iterable[str], mark: str, width: int) -> list[str]:
    """Each text behind its mark, continued under its first word."""
    indent = " " * len(mark)
    return [line for text in texts for line in wrap(mark + text, width, indent)]
