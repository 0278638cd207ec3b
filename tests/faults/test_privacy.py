"""A logbook tells where someone is and when: what is written is its owner's alone, and nothing leaves the computer."""

from __future__ import annotations

import os
import stat
from pathlib import Path

import pytest

from energytrack.logbook.store import Store
from tests.documents import ROOT
from tests.faults.commands import done, new_logbook, run

WATCH = """
import os, sys
def watch(event, words):
    if event.startswith("socket.") and event != "socket.gethostname":
        raise RuntimeError(f"no network access: {event}")
    if event == "open" and isinstance(words[0], str):
        mode, flags = words[1], words[2]
        if (mode and set(mode) & set("wxa+")) or (flags or 0) & (os.O_WRONLY | os.O_RDWR | os.O_CREAT):
            with_log(os.path.abspath(words[0]))
    if event in ("os.mkdir", "tempfile.mkstemp", "tempfile.mkdtemp"):
        with_log(os.path.abspath(words[0]))
def with_log(path):
    os.write(log, (path + "\\n").encode())
log = os.open(os.environ["WATCH"], os.O_WRONLY | os.O_CREAT | os.O_APPEND)
sys.addaudithook(watch)
"""
TABLE = "date,odometer_km,energy\n2025-06-01,20000,40\n2025-06-05,20500,bad\n2025-06-09,21000,41\n"
LINES: tuple[tuple[object, ...], ...] = (
    ("--help",),
    ("vehicle", "add", "car", "--carrier", "petrol"),
    ("fillup", 17_000, 40, "--date", "2025-05-01", "--vehicle", "van", "--place", "somewhere"),
    ("fillup", 10_000, 30, "--date", "2025-05-01", "--vehicle", "car"),
    ("mod", "fitted", "skirts", 13_000, "--vehicle", "van", "--date", "2025-01-07"),
    ("event", "new tyres", 13_100, "--vehicle", "van", "--date", "2025-01-07"),
    ("entries",),
    ("amend", 17_000, "--amount", 41, "--vehicle", "van"),
    ("confirm", 17_000, "--vehicle", "van"),
    ("strike", 10_000, "--vehicle", "car"),
    ("undo",),
    ("history",),
    ("import", "more.csv", "--vehicle", "van", "--skip-bad", "bad.csv"),
    ("enough", "--vehicle", "van"),
    ("plan", "--target", "3", "--vehicle", "van"),
    ("rehearse", "--vehicle", "van", "--runs", "2"),
    ("export", "out"),
    ("export", "out", "--force"),
    ("backup", "copy"),
    ("backup", "copy", "--force"),
    ("check",),
)


@pytest.fixture
def watched(tmp_path: Path) -> dict[str, str]:
    """The environment of a process whose writing is noted, and which may open no socket."""
    hook = tmp_path / "hook"
    hook.mkdir()
    (hook / "sitecustomize.py").write_text(WATCH)
    noted = {"WATCH": str(tmp_path / "watched"), "PYTHONDONTWRITEBYTECODE": "1"}
    return {"PYTHONPATH": f"{hook}{os.pathsep}{ROOT}", **noted}


def test_no_command_needs_the_network_or_writes_elsewhere(
    tmp_path: Path, watched: dict[str, str], monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = tmp_path / "own"
    folder.mkdir()
    monkeypatch.chdir(folder)
    (folder / "more.csv").write_text(TABLE)
    path = new_logbook(folder / "my.logbook")
    others = set(folder.iterdir()) - {path}
    for words in LINES:
        done(path, *words, **watched)
    noted = {Path(line) for line in (tmp_path / "watched").read_text().splitlines()}
    assert [each for each in noted if not each.is_relative_to(folder) and each != Path(os.devnull)] == []
    written = set(folder.rglob("*")) - others
    assert len(written) > 15
    if os.name == "posix":
        modes = {each: stat.S_IMODE(each.stat().st_mode) for each in written}
        assert {each: mode for each, mode in modes.items() if mode != (0o700 if each.is_dir() else 0o600)} == {}


def test_the_watch_sees_a_socket(tmp_path: Path, watched: dict[str, str]) -> None:
    """Else the test above could not fail."""
    import subprocess
    import sys

    code = "import socket; socket.socket()"
    ended = subprocess.run(
        [sys.executable, "-c", code], env={**os.environ, **watched}, capture_output=True, text=True, check=False
    )
    assert "no network access: socket.__new__" in ended.stderr


@pytest.mark.skipif(os.name != "posix", reason="file modes are POSIX")
def test_files_beside_an_open_logbook_are_its_owners(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    store = Store(path)
    store.confirm(1)
    assert {each.name: stat.S_IMODE(each.stat().st_mode) for each in tmp_path.iterdir()} == {
        path.name: 0o600, f"{path.name}-wal": 0o600, f"{path.name}-shm": 0o600,
    }  # fmt: skip
    assert store.query("PRAGMA temp_store") == [(2,)], "SQLite sorts in memory, not in a shared temporary folder"
    store.close()
    assert run(path, "check").returncode == 0
