"""Tables as they are written: RFC 4180, UTF-8, one line feed after each row."""

from __future__ import annotations

import datetime as dt
import math
import os
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import TextIO

from energytrack.logbook.formulas import neutralised

_QUOTED = (",", '"', "\n", "\r")


def new_file(path: Path) -> TextIO:
    """A new file that only its owner can read. Raises OSError, where something has its name FileExistsError."""
    return open(path, "x", encoding="utf-8", newline="", opener=lambda name, flags: os.open(name, flags, 0o600))


def cells_of(record: object, names: Iterable[str]) -> list[str]:
    """The attributes of a record as cells."""
    return [cell(getattr(record, name)) for name in names]


def cell(value: object) -> str:
    """A value as the text of a cell; what is not known is empty, text is made inert."""
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return repr(value).removesuffix(".0")
    return value.isoformat() if isinstance(value, dt.date) else neutralised(str(value))


def lines(rows: Iterable[Sequence[str]]) -> Iterator[str]:
    """Rows of cells as lines. The csv module leaves a lone carriage return unquoted, and cannot read it back."""
    for row in rows:
        plain = ",".join(row)
        if plain.count(",") >= len(row) or any(mark in plain for mark in _QUOTED[1:]):
            plain = ",".join(map(_quoted, row))
        yield plain + "\n"


def _quoted(text: str) -> str:
    if any(mark in text for mark in _QUOTED):
        return '"' + text.replace('"', '""') + '"'
    return text
