"""A logbook written by every older version: brought up to date, after a copy of it as it was."""

from __future__ import annotations

import os
import sqlite3
import stat
import subprocess
from pathlib import Path

import pytest

from energytrack.logbook import schema
from tests.faults.commands import beside, command, done, environment, is_sound, odometers, refused, run

STATEMENTS = Path(__file__).parent.parent / "logbook"  # of each version, as they were released
OLDER = range(1, len(schema.MIGRATIONS))
ROWS = """
INSERT INTO vehicle (name, carrier, unit, distance_unit, note, recorded_at)
    VALUES ('van', 'diesel', 'L', 'km', '', '2025-01-01T00:00:00+00:00');
INSERT INTO entry (vehicle_id, date, odometer_km, energy, kind, full, missed, place, note, extra, typed, source,
        recorded_at)
    VALUES (1, '2025-01-01', 10000.0, 40.0, 'fill-up', 1, 0, '', '', '{}', '{}', 'terminal',
        '2025-01-01T00:00:00+00:00');
"""


@pytest.fixture(params=OLDER)
def version(request: pytest.FixtureRequest) -> int:
    number: int = request.param
    return number


@pytest.fixture
def path(tmp_path: Path, version: int) -> Path:
    made = tmp_path / "my.logbook"
    connection = sqlite3.connect(made)
    connection.executescript((STATEMENTS / f"version_{version}.sql").read_text() + ROWS)
    connection.close()
    return made


def version_of(path: Path) -> int:
    connection = sqlite3.connect(path)
    found: int = connection.execute("PRAGMA user_version").fetchone()[0]
    connection.close()
    return found


def test_it_is_kept_as_it_was_and_that_is_told_once(path: Path, version: int) -> None:
    kept = path.with_name(f"{path.name}.version-{version}")
    first = run(path, "fillup", 10_500, 40, "--date", "2025-01-05")
    assert first.returncode == 0, first.stderr
    (told,) = first.stderr.splitlines()
    assert told.endswith(f"brought up to date; as it was, it is kept as {kept}")
    assert run(path, "entries").stderr == ""
    assert odometers(path) == [10_000, 10_500]
    assert (version_of(path), version_of(kept)) == (len(schema.MIGRATIONS), version)
    assert sqlite3.connect(kept).execute("SELECT odometer_km FROM entry").fetchall() == [(10_000.0,)]
    if os.name == "posix":
        assert stat.S_IMODE(kept.stat().st_mode) == 0o600
    assert beside(path) == {path.name, kept.name}
    assert is_sound(path)


def test_a_name_that_is_taken_is_left_alone(path: Path, version: int) -> None:
    taken = path.with_name(f"{path.name}.version-{version}")
    taken.write_text("mine")
    done(path, "entries")
    assert taken.read_text() == "mine"
    assert version_of(path.with_name(f"{taken.name}-2")) == version


def test_several_programs_at_once_bring_it_up_to_date_once(path: Path) -> None:
    processes = [
        subprocess.Popen(
            command(path, "entries"), stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment()
        )
        for _ in range(4)
    ]
    ended = [(*process.communicate(timeout=60), process.returncode) for process in processes]
    assert [status for *_, status in ended] == [0] * 4, ended
    assert len([said for _, said, _ in ended if "brought up to date" in said]) == 1
    assert len(beside(path)) == 2


@pytest.mark.skipif(os.name != "posix", reason="resource limits are POSIX")
def test_without_room_for_the_copy_nothing_is_changed(path: Path, version: int) -> None:
    import resource

    before = path.read_bytes()
    refused(run(path, "entries", before=lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (8_192, 8_192))))
    assert (path.read_bytes(), beside(path)) == (before, {path.name})
    assert version_of(path) == version
