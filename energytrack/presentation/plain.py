"""Text that others wrote, made safe to print. Standard library only."""

from __future__ import annotations


def plain_text(text: str) -> str:
    """The text on one line, without anything a terminal obeys: controls, escapes, direction marks become `\\ufffd`."""
    return "".join(_safe(character) for character in text)


def _safe(character: str) -> str:
    if character.isprintable():
        return character
    return " " if character.isspace() else "\ufffd"
