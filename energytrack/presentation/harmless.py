"""User text made harmless for a terminal. Standard library only: the quick commands need it too."""

from __future__ import annotations

import unicodedata


def clean(text: str) -> str:
    """The text without anything a terminal obeys: controls, escapes and direction marks become visible codes."""
    return "".join(character if character.isprintable() else _visible(character) for character in text)


def _visible(character: str) -> str:
    if unicodedata.category(character) == "Zs":  # spaces of other widths
        return " "
    return character.encode("unicode_escape").decode("ascii")
