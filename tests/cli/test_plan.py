"""`plan` as a process, without a logbook and for parts that stay on."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

STATED = ("--trip-noise", "4", "--drift", "1", "--date", "2026-03-01", "--target", "5")


def run(*words: str, folder: Path, logbook: str | None = None) -> subprocess.CompletedProcess[str]:
    environment = {name: value for name, value in os.environ.items() if not name.startswith("ENERGYTRACK_")}
    before = [] if logbook is None else ["--logbook", logbook]
    return subprocess.run(
        [sys.executable, "-m", "energytrack", *before, *words],
        cwd=folder, env={**environment, "COLUMNS": "80", "PYTHONPATH": os.getcwd()},
        capture_output=True, text=True, encoding="utf-8", check=False,
    )  # fmt: skip


def test_a_plan_without_a_logbook(tmp_path: Path) -> None:
    done = run("plan", *STATED, folder=tmp_path)
    assert (done.returncode, done.stderr) == (0, "")
    assert "off and on every" in " ".join(done.stdout.splitlines()[:2])
    assert "scatter, stated" in done.stdout
    assert max(map(len, done.stdout.splitlines())) <= 80
    assert list(tmp_path.iterdir()) == []


def test_every_stated_figure_reaches_the_plan(tmp_path: Path) -> None:
    figures = (
        *("--filling", "0.9", "--season-drift", "0.3", "--capacity", "60", "--consumption", "20", "--unit", "kWh"),
        *("--distance-per-fill", "250", "--days-per-fill", "3", "--baseline", "2500", "--temperature-range", "-5:25"),
    )
    (found,) = json.loads(run("plan", *STATED, *figures, "--json", folder=tmp_path).stdout)["plans"]
    assert found["stated"] is True
    assert (found["unit"], found["segments_baseline"], found["distance_baseline_km"]) == ("kWh", 10, 2500.0)
    noise = found["noise"]
    assert noise["level_error"] == pytest.approx(0.9)
    assert noise["drift_seasons_percent"] == pytest.approx(0.3)
    best = next(design for design in found["designs"] if design["name"] == "best-date")
    assert "2026-04-01" <= best["start"] <= "2027-03-01"


def test_a_part_that_stays_on_gets_only_ways_that_leave_it_on(tmp_path: Path) -> None:
    (found,) = json.loads(run("plan", *STATED, "--not-reversible", "--json", folder=tmp_path).stdout)["plans"]
    assert found["reversible"] is False
    assert [design["name"] for design in found["designs"]] == ["one-switch", "best-date", "longer-baseline"]


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ((), "no noise stated"),
        (("--drift", "1"), "needs at least --trip-noise"),
        (("--trip-noise", "0"), "trip noise of 0"),
        (("--trip-noise", "5", "--target", "0"), "target"),
        (("--trip-noise", "5", "--temperature-range", "12"), "JANUARY:JULY"),
        (("--trip-noise", "5", "--temperature-range", "a:b"), "temperature of January"),
        (("--trip-noise", "5", "--baseline", "10"), "less than 5 fill-ups"),
        (("--trip-noise", "5", "--date", "yesterday"), "yesterday"),
    ],
)
def test_refusals_are_one_line_and_status_1(words: tuple[str, ...], said: str, tmp_path: Path) -> None:
    done = run("plan", *words, folder=tmp_path)
    assert done.returncode == 1
    assert said in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert done.stdout == ""


def test_a_vehicle_of_no_logbook_is_wrong_usage(tmp_path: Path) -> None:
    assert run("plan", *STATED, "--vehicle", "van", folder=tmp_path).returncode == 2


def test_dates_of_a_plan_from_a_log_count_from_the_day_given(tmp_path: Path) -> None:
    book = str(Path(__file__).parents[2] / "demo_logbook")
    done = run("plan", "--vehicle", "van", "--date", "2030-05-02", "--json", folder=tmp_path, logbook=book)
    (found,) = json.loads(done.stdout)["plans"]
    best = next(design for design in found["designs"] if design["name"] == "best-date")
    assert "2030-06-01" <= best["start"] <= "2031-05-01"
    refused = run("plan", "--vehicle", "van", "--date", "soon", folder=tmp_path, logbook=book)
    assert (refused.returncode, "'soon'" in refused.stderr) == (1, True)
