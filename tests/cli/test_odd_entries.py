"""Odd entries and weather files at the command line, as processes on a real logbook file."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE

PLACE = 15


def run(logbook: Path, *words: object, status: int = 0) -> str:
    command = [sys.executable, "-m", "energytrack", "--logbook", str(logbook), *map(str, words)]
    done = subprocess.run(command, capture_output=True, text=True, env={**os.environ, "COLUMNS": "80"}, check=False)
    assert done.returncode == status, done.stderr
    return done.stdout if status == 0 else done.stderr


@pytest.fixture
def logbook(tmp_path: Path) -> Path:
    """A commute with one amount 2.5 times too large."""
    log = simulate(replace(STEADY_COMMUTE, fillings=40), np.random.default_rng([2, 5]))
    entries = log.entries.reset_index(drop=True).drop(columns="vehicle")
    entries.loc[PLACE, "energy"] = round(entries.loc[PLACE, "energy"] * 2.1, 2)
    entries.loc[20:22, "temperature_c"] = np.nan
    entries.to_csv(tmp_path / "log.csv", index=False)
    path = tmp_path / "my.logbook"
    run(path, "import", tmp_path / "log.csv", "--vehicle", "van", "--carrier", "petrol", "--capacity", 50)
    run(path, "mod", "fitted", "skirts", int(log.modifications["fitted_km"].iloc[0]))
    return path


def answer(logbook: Path, *options: str) -> dict[str, object]:
    found: dict[str, object] = json.loads(run(logbook, "enough", "--json", *options))["assessments"][0]
    return found


def test_odd_entries_are_told_and_can_be_kept(logbook: Path) -> None:
    (odd,) = answer(logbook)["set_aside"]  # type: ignore[misc]
    said = run(logbook, "enough")
    assert f"! entry of {odd['date']} at {odd['odometer_km']:,.0f}" in said.replace("\u00a0", " ")
    assert "energytrack confirm ODOMETER" in said
    assert answer(logbook, "--keep-all")["set_aside"] == []
    assert "unusual" in run(logbook, "entries", "--last", 40)
    assert "is kept" in run(logbook, "confirm", int(odd["odometer_km"]))
    assert answer(logbook)["set_aside"] == []
    listed = run(logbook, "entries", "--last", 40)
    assert "confirmed" in listed
    assert "unusual" not in listed


def test_confirm_by_date_and_as_json(logbook: Path) -> None:
    (odd,) = answer(logbook)["set_aside"]  # type: ignore[misc]
    assert len(json.loads(run(logbook, "confirm", "--date", odd["date"], "--json"))["confirmed"]) == 1
    assert answer(logbook)["set_aside"] == []


def test_confirm_refuses_what_is_not_there(logbook: Path) -> None:
    assert run(logbook, "confirm", 5, status=1) == "energytrack: van has no entry at 5 km: `entries` lists them\n"
    assert "type its odometer value" in run(logbook, "confirm", status=1)


def test_weather_fills_in_temperatures_once(logbook: Path, tmp_path: Path) -> None:
    listed = json.loads(run(logbook, "entries", "--last", 40, "--json"))["entries"]
    lacking = [entry["date"] for entry in listed if entry["temperature_c"] is None]
    assert len(lacking) >= 3
    path = tmp_path / "weather.csv"
    path.write_text("date,temperature_c\n" + "".join(f"{day},7.5\n" for day in lacking), encoding="utf-8")
    first = json.loads(run(logbook, "weather", path, "--json"))
    assert first["new"] == len(lacking)
    (van,) = first["vehicles"]
    assert van == {"vehicle": "van", "entries": 40, "own": 40 - len(lacking), "filled": len(lacking)}
    assert f"0 days added, {len(lacking)} already there" in run(logbook, "weather", path)


def test_a_bad_weather_file_changes_nothing(logbook: Path, tmp_path: Path) -> None:
    path = tmp_path / "weather.csv"
    path.write_text("date,temperature_c\n2024-01-01,5\n2024-01-01,6\n", encoding="utf-8")
    refusal = run(logbook, "weather", path, status=1)
    assert "weather.csv:3: " in refusal
    assert refusal.count("\n") == 1
    assert "1 day added" in run(logbook, "weather", path, "--skip-bad")


def test_what_would_fit_is_listed_whole_within_80_columns(logbook: Path) -> None:
    every = json.loads(run(logbook, "entries", "--last", 40, "--json"))["entries"]
    (odd,) = [entry for entry in every if entry["slips"]]
    listed = run(logbook, "entries", "--last", 40)
    assert max(map(len, listed.splitlines())) <= 80
    assert odd["slips"][0] in " ".join(listed.split())
