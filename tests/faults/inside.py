"""The command line inside this process: quick enough for hundreds of runs, and what must be true of each."""

from __future__ import annotations

import contextlib
import io
import sqlite3
import sys
import unicodedata
from dataclasses import dataclass
from pathlib import Path
from unittest import mock

from energytrack.cli.app import main
from energytrack.logbook import file


@dataclass(frozen=True)
class Ended:
    """What a command left behind."""

    status: int
    out: str
    err: str


def inside(logbook: Path, *words: object) -> Ended:
    """Run a command; an exception that a user would see as a traceback goes through."""
    out, err = (io.TextIOWrapper(io.BytesIO(), encoding="utf-8", errors="replace") for _ in range(2))
    status: object = 0
    argv = ["energytrack", "--logbook", str(logbook), *map(str, words)]
    told = file.tell
    try:
        with (
            mock.patch.object(sys, "argv", argv),
            mock.patch.object(sys, "stdin", io.StringIO()),
            contextlib.redirect_stdout(out),
            contextlib.redirect_stderr(err),
        ):
            main()
    except SystemExit as ended:
        status = ended.code or 0
    finally:
        file.tell = told
    assert isinstance(status, int)
    return Ended(status, *(_written(stream) for stream in (out, err)))


def _written(stream: io.TextIOWrapper) -> str:
    stream.flush()
    raw = stream.buffer
    assert isinstance(raw, io.BytesIO)
    return raw.getvalue().decode()


def obeyed(text: str) -> set[str]:
    """The characters that a terminal obeys or that turn the direction of a text (Unicode: Cc, Cf, Zl, Zp)."""
    return {each for each in text if unicodedata.category(each) in ("Cc", "Cf", "Zl", "Zp", "Cs")} - {"\n"}


def is_told(ended: Ended) -> bool:
    """Done, not yet, or refused: one line of what is wrong, after one for each bad row of a table."""
    if ended.status in (0, 10):
        return True
    if ended.status == 2:  # of usage: by the parser of arguments, with a line of usage before it
        return "Error: " in ended.err or "Usage: " in ended.err
    lines = ended.err.splitlines()
    return ended.status == 1 and bool(lines) and lines[-1].startswith("energytrack: ")


def held(path: Path) -> str:
    """What a logbook file holds, as SQL."""
    with contextlib.closing(sqlite3.connect(path)) as connection:
        return "\n".join(connection.iterdump())
