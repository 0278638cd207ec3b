"""How far a long computation is, on standard error, where someone sits in front of it."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager

from rich.console import Console
from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

from energytrack.presentation.plain import plain_text


@contextmanager
def progress(what: str) -> Iterator[Callable[[int, int], None]]:
    """A function to call with how many are done and of how many; nothing is shown in a pipe."""
    screen = Console(stderr=True, markup=False, emoji=False)
    columns = (TextColumn("{task.description}", markup=False), BarColumn(), MofNCompleteColumn(), TimeRemainingColumn())
    with Progress(*columns, console=screen, transient=True, disable=not screen.is_terminal) as shown:
        task = shown.add_task(plain_text(what), total=None)
        yield lambda done, of: shown.update(task, completed=done, total=of)
