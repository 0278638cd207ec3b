"""Corrections at the command line, as processes on a real logbook file."""

from __future__ import annotations

import datetime as dt
import json
import os
import shlex
import subprocess
import sys
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE

TODAY = dt.date.today().isoformat()


def run(logbook: Path, *words: object, status: int = 0) -> str:
    command = [sys.executable, "-m", "energytrack", "--logbook", str(logbook), *map(str, words)]
    done = subprocess.run(command, capture_output=True, text=True, env={**os.environ, "COLUMNS": "80"}, check=False)
    assert done.returncode == status, done.stderr
    assert "Traceback" not in done.stderr
    return done.stdout if status == 0 else done.stderr


def listed(logbook: Path, *options: object) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = json.loads(run(logbook, "entries", "--json", "--last", 99, *options))["entries"]
    return found


@pytest.fixture
def logbook(tmp_path: Path) -> Path:
    path = tmp_path / "my.logbook"
    run(path, "new")
    run(path, "vehicle", "add", "van", "--carrier", "diesel", "--capacity", 70)
    for day, km, amount in ((1, 48_000, 40.1), (6, 48_500, 41.3), (11, 49_000, 39.9)):
        run(path, "fillup", km, amount, "--date", f"2026-05-{day:02}", "--temperature", 12)
    return path


def test_amend_strike_undo_and_history(logbook: Path) -> None:
    said = run(logbook, "amend", 48_500, "--amount", 31.4, "--partial", "--why", "read the receipt again")
    assert said.splitlines()[1].strip() == (
        "van, 48,500 km, 2026-05-06: amount 41.30 L -> 31.40 L; fill full -> partial"
    )
    entry = listed(logbook)[1]
    assert (entry["energy"], entry["full"], entry["temperature_c"], entry["id"]) == (31.4, False, 12.0, 2)
    assert "energytrack amend 49000 --missed" in run(logbook, "strike", 48_500, "--why", "twice")
    assert [entry["odometer_km"] for entry in listed(logbook)] == [48_000, 49_000]
    told = run(logbook, "history", 48_500)
    said_of_it = ("logged", "amended: read the receipt again", "struck: twice")
    assert [words for words in said_of_it if words not in told] == []
    changes = json.loads(run(logbook, "history", 48_500, "--json"))["changes"]
    revisions = [each["revisions"][0] for each in changes]
    amounts = [[each[side] and each[side]["energy"] for side in ("was", "became")] for each in revisions]
    assert amounts == [
        [None, 41.3],
        [41.3, 31.4],
        [31.4, None],
    ]
    run(logbook, "undo")
    run(logbook, "undo", "--why", "it was right")
    assert [entry["energy"] for entry in listed(logbook)] == [40.1, 41.3, 39.9]
    assert "undone (change 5): it was right" in run(logbook, "history", "--last", 1)
    run(logbook, "undo")
    assert [entry["energy"] for entry in listed(logbook)] == [40.1, 41.3]


def test_an_amended_odometer_is_found_by_either_value(logbook: Path) -> None:
    run(logbook, "amend", 48_500, "--odometer", 48_520, "--date", "2026-05-07")
    assert run(logbook, "history", 48_500) == run(logbook, "history", 48_520) == run(logbook, "history", "2026-05-07")
    assert "never had an entry at 5" in run(logbook, "history", 5, status=1)


@pytest.mark.parametrize(
    ("words", "why"),
    [
        (("amend", "48500"), "says so already"),
        (("amend", "48500", "--odometer", "47000"), "goes back"),
        (("amend", "48500", "--odometer", "49000"), "stands still|does not fit|goes back"),
        (("amend", "48500", "--date", "2026-05-20"), "goes back|does not fit"),
        (("amend", "48500", "--date", "2126-05-20"), "in the future"),
        (("amend", "48500", "--amount", "400"), "times the capacity"),
        (("amend", "48500", "--distance", "400"), "amend that"),
        (("amend", "48500", "--clear", "odometer"), "is not one of: level"),
        (("amend", "5", "--note", "x"), "has no entry at 5"),
        (("amend", "--note", "x"), "say which entry"),
        (("amend", "48500", "--amount", "-3"), "more than 0"),
        (("strike", "--number", "99"), "no entry 99"),
    ],
)
def test_what_cannot_be_is_refused_and_changes_nothing(logbook: Path, words: tuple[str, ...], why: str) -> None:
    before = run(logbook, "history", "--json")
    refusal = run(logbook, *words, status=1)
    assert refusal.count("\n") == 1
    assert any(each in refusal for each in why.split("|")), refusal
    assert run(logbook, "history", "--json") == before


def test_a_field_is_cleared(logbook: Path) -> None:
    run(logbook, "amend", 48_500, "--set", "payload=300", "--note", "hills")
    assert listed(logbook)[1]["payload"] == 300
    run(logbook, "amend", 48_500, "--clear", "payload", "--clear", "note", "--clear", "temperature")
    entry = listed(logbook)[1]
    assert ("payload" in entry, entry["note"], entry["temperature_c"]) == (False, "", None)


def test_as_of_goes_by_the_day_of_recording(logbook: Path) -> None:
    assert run(logbook, "entries", "--as-of", "2026-05-30") == "nothing was recorded by 2026-05-30\n"
    assert listed(logbook, "--as-of", TODAY) == listed(logbook)
    assert "in the future" in run(logbook, "entries", "--as-of", "2999-01-01", status=1)


def test_several_entries_at_one_place_are_told_apart(tmp_path: Path) -> None:
    path = tmp_path / "my.logbook"
    run(path, "new")
    run(path, "vehicle", "add", "bike", "--carrier", "petrol", "--capacity", 15)
    for _ in range(2):
        run(path, "fillup", 4.5, "--distance", 100, "--date", "2026-05-03", "--again")
    refusal = run(path, "amend", "2026-05-03", "--amount", 4.7, status=1)
    assert "add --number with one of 1 (fill-up, 4.50 L), 2 (fill-up, 4.50 L)" in refusal
    run(path, "amend", "--number", 2, "--amount", 4.7)
    assert [entry["energy"] for entry in listed(path)] == [4.5, 4.7]


@pytest.fixture
def asked(tmp_path: Path) -> tuple[Path, dict[str, Any]]:
    """A commute with one amount typed wrong, an answer that was given, and the odd entry."""
    log = simulate(replace(STEADY_COMMUTE, fillings=40), np.random.default_rng([2, 5]))
    entries = log.entries.reset_index(drop=True).drop(columns="vehicle")
    right = f"{entries.loc[15, 'energy']:.2f}"
    entries.loc[15, "energy"] = float(right[0] + right)  # its first digit twice
    entries.to_csv(tmp_path / "log.csv", index=False)
    path = tmp_path / "my.logbook"
    run(path, "import", tmp_path / "log.csv", "--vehicle", "van", "--carrier", "petrol")
    run(path, "mod", "fitted", "skirts", int(log.modifications["fitted_km"].iloc[0]))
    (answer,) = json.loads(run(path, "enough", "--json"))["assessments"]
    (odd,) = answer["set_aside"]
    return path, {**odd, "right": float(right)}


def test_the_command_that_corrects_a_slip_is_told_and_works(asked: tuple[Path, dict[str, Any]]) -> None:
    path, odd = asked
    lines = run(path, "enough").replace("\u00a0", " ").splitlines()
    (told,) = [line.partition("energytrack ")[2] for line in lines if "energytrack amend" in line][:1]
    also = [line for line in run(path, "entries", "--last", 40).splitlines() if "energytrack amend" in line]
    assert told.removesuffix(" --vehicle van") in also[0]
    said = run(path, *shlex.split(told))
    assert "skirts: the verdict" in said
    assert [each["energy"] for each in listed(path) if each["date"] == odd["date"]] == [pytest.approx(odd["right"])]
    (answer,) = json.loads(run(path, "enough", "--json"))["assessments"]
    assert answer["set_aside"] == []


def test_answers_before_and_after_are_those_enough_gives(asked: tuple[Path, dict[str, Any]]) -> None:
    path, odd = asked
    before = json.loads(run(path, "enough", "--json"))["assessments"][0]
    done = json.loads(run(path, "strike", int(odd["odometer_km"]), "--json"))
    after = json.loads(run(path, "enough", "--json"))["assessments"][0]
    (answer,) = done["answers"]
    for told, expected in ((answer["before"], before), (answer["after"], after)):
        assert (told["verdict"], told["shift_percent"]) == (expected["verdict"], expected["shift_percent"])
    assert answer["verdict_changed"] == (before["verdict"] != after["verdict"])
    then = json.loads(run(path, "enough", "--json", "--as-of", TODAY))["assessments"][0]
    assert then == after


def test_undoing_a_fitting_takes_its_verdict_away(asked: tuple[Path, dict[str, Any]]) -> None:
    path, _ = asked
    (answer,) = json.loads(run(path, "undo", "--json"))["answers"]
    assert (answer["after"]["verdict"], answer["verdict_changed"]) == (None, True)
    assert "no modification is logged" in run(path, "enough", status=1)


def test_without_an_answer_nothing_heavy_is_loaded(logbook: Path) -> None:
    code = (
        "import sys; from energytrack.cli.app import app; "
        f"sys.argv = ['energytrack', '--logbook', {str(logbook)!r}, 'amend', '48500', '--note', 'x']\n"
        "try: app()\nexcept SystemExit as end: assert not end.code, end.code\n"
        "print(sorted({'numpy', 'pandas', 'scipy', 'statsmodels', 'rich'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-1] == "[]"


def test_export_import_backup_and_check(logbook: Path, tmp_path: Path) -> None:
    run(logbook, "amend", 48_500, "--note", "=2+3", "--why", "-")
    assert "16 files" in run(logbook, "export", tmp_path / "out")
    assert "not empty" in run(logbook, "export", tmp_path / "out", status=1)
    again = tmp_path / "again.logbook"
    run(again, "new")
    run(again, "import", tmp_path / "out")
    assert run(again, "history", "--json") == run(logbook, "history", "--json")
    assert listed(tmp_path / "out")[1]["note"] == "=2+3"
    assert "folder of tables" in run(tmp_path / "out", "amend", 48_500, "--note", "x", status=1)
    assert "keeps no history" in run(tmp_path / "out", "history", status=1)
    run(logbook, "backup", tmp_path / "copy")
    assert run(tmp_path / "copy", "check").split()[-4:] == ["entries", "3", "changes", "5"]
    content = bytearray(logbook.read_bytes())
    content[4096:] = b"\xff" * (len(content) - 4096)
    logbook.write_bytes(content)
    (tmp_path / "my.logbook-wal").unlink(missing_ok=True)
    assert "SQLite" in json.loads(fault_report(logbook))["faults"][0]["what"]
    assert run(logbook, "check", "--repair-from", tmp_path / "copy").split()[-2:] == ["changes", "5"]
    assert listed(logbook) == listed(again)
    assert (tmp_path / "my.logbook.damaged-1").read_bytes() == content


def fault_report(logbook: Path) -> str:
    """What `check --json` prints on a damaged logbook."""
    command = [sys.executable, "-m", "energytrack", "--logbook", str(logbook), "check", "--json"]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert (done.returncode, "Traceback" in done.stderr) == (1, False)
    return done.stdout
