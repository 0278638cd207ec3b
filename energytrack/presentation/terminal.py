"""Lines to the terminal: colour and weight only where one is there to see them, 80 columns where none is."""

from __future__ import annotations

from collections.abc import Iterable

from rich.console import Console
from rich.text import Text

PIPED_WIDTH = 80
_NARROWEST, _WIDEST = 60, 100


def console() -> Console:
    """Standard output: colours off with NO_COLOR, no styles at all in a pipe."""
    found = Console(markup=False, highlight=False, emoji=False)
    found.width = min(max(found.width, _NARROWEST), _WIDEST) if found.is_terminal else PIPED_WIDTH
    return found


def show(lines: Iterable[Text], to: Console) -> None:
    """Print lines already broken to width."""
    for line in lines:
        to.print(line, soft_wrap=True)
