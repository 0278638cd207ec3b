"""Text that a spreadsheet would run as a formula, made inert on the way out and restored on the way in.

A cell that begins with = + - @ TAB or CR gets an apostrophe before it, as a spreadsheet marks text; so does one that
begins with an apostrophe already, which keeps the way back unambiguous.
"""

from __future__ import annotations

MARK = "'"
_LEADING = ("=", "+", "-", "@", "\t", "\r", MARK)


def neutralised(text: str) -> str:
    """The text as a cell of an exported table."""
    return MARK + text if text.startswith(_LEADING) else text


def restored(text: str) -> str:
    """The text that `neutralised` made this cell from; any other cell as it is."""
    return text[1:] if text.startswith(MARK) and text[1:].startswith(_LEADING) else text
