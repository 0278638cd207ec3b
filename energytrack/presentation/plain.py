"""Text that others wrote, made safe to print. Standard library only."""

from __future__ import annotations

_END = 1000  # characters


def plain_text(text: str) -> str:
    """The text on one line, without anything a terminal obeys: controls, escapes, direction marks become `\\ufffd`."""
    return "".join(_safe(character) for character in text)


def in_a_line(text: str) -> str:
    """A message as one safe line; of one that repeats a huge text, both ends."""
    line = plain_text(text)
    return line if len(line) <= 2 * _END else f"{line[:_END]} ... {line[-_END:]}"


def _safe(character: str) -> str:
    if character.isprintable():
        return character
    return " " if character.isspace() else "\ufffd"
