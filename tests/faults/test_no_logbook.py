"""Files that are no logbook, or one no longer: each command says so in one line and leaves them as they are."""

from __future__ import annotations

import random
import sqlite3
from collections.abc import Callable
from pathlib import Path

import pytest

from energytrack.logbook import schema
from tests.faults.commands import beside, new_logbook, refused, run

COMMANDS = (
    ("fillup", 20_000, 40), ("entries",), ("enough",), ("history",), ("undo",), ("export", "OUT"), ("backup", "OUT"),
)  # fmt: skip


def empty(path: Path) -> None:
    path.touch()


def garbage(path: Path) -> None:
    path.write_bytes(random.Random(1).randbytes(20_000))


def text(path: Path) -> None:
    path.write_text("vehicle,date,odometer_km,energy\nvan,2025-05-03,48230,41.32\n" * 50)


def another_database(path: Path) -> None:
    connection = sqlite3.connect(path)
    connection.execute("CREATE TABLE entry (id INTEGER)")
    connection.close()


def cut(path: Path, share: float) -> None:
    new_logbook(path, 200)
    content = path.read_bytes()
    path.write_bytes(content[: int(share * len(content))])


def cut_to_half(path: Path) -> None:
    cut(path, 0.5)


def cut_by_a_page(path: Path) -> None:
    cut(path, 0.97)


def cut_to_some_bytes(path: Path) -> None:
    cut(path, 0.0005)


def damaged_header(path: Path) -> None:
    new_logbook(path)
    content = bytearray(path.read_bytes())
    content[:16] = b"something else.."
    path.write_bytes(content)


MAKERS: list[Callable[[Path], None]] = [
    empty, garbage, text, another_database, cut_to_half, cut_by_a_page, cut_to_some_bytes, damaged_header,
]  # fmt: skip


@pytest.mark.parametrize("make", MAKERS)
def test_no_logbook(tmp_path: Path, make: Callable[[Path], None]) -> None:
    path = tmp_path / "my.logbook"
    make(path)
    content, held = path.read_bytes(), beside(path)
    for words in COMMANDS:
        refused(run(path, *(str(tmp_path / "out") if word == "OUT" else word for word in words)), str(path))
        assert path.read_bytes() == content
        assert beside(path) - {f"{path.name}-wal", f"{path.name}-shm"} == held
    checked = run(path, "check")
    assert checked.returncode == 1
    assert "Traceback" not in checked.stderr
    assert path.read_bytes() == content


def test_a_newer_version_is_refused(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    newer = len(schema.MIGRATIONS) + 1
    connection = sqlite3.connect(path)
    connection.execute(f"PRAGMA user_version = {newer}")
    connection.close()
    content = path.read_bytes()
    for words in COMMANDS:
        named = [str(tmp_path / "out") if word == "OUT" else str(word) for word in words]
        refused(run(path, *named), f"tables of version {newer}", "install the newer energytrack")
    assert path.read_bytes() == content
    assert beside(path) == {path.name}
