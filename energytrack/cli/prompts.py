"""Questions on a terminal for what was left out of a command."""

from __future__ import annotations

import sys
from collections.abc import Callable

from energytrack.errors import EntryError
from energytrack.presentation.plain import plain_text


def on_terminal() -> bool:
    """Whether somebody is there to answer."""
    return sys.stdin.isatty() and sys.stdout.isatty()


def ask(question: str, check: Callable[[str], object]) -> str:
    """An answer that `check` accepts; its refusal is shown and the question asked again.

    Raises EntryError at the end of input.
    """
    while True:
        try:
            answer = input(plain_text(question) + ": ").strip()
            check(answer)
            return answer
        except EntryError as refusal:
            print(plain_text(str(refusal)))
        except EOFError:
            print()
            raise EntryError("not answered: nothing was written") from None
