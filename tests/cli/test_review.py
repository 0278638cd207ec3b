"""`review` as a process on real logbook files."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "demo_logbook"


def run(logbook: Path, *words: str, **environment: str) -> subprocess.CompletedProcess[str]:
    kept = {name: value for name, value in os.environ.items() if not name.startswith("ENERGYTRACK_")}
    return subprocess.run(
        [sys.executable, "-m", "energytrack", "--logbook", str(logbook), *words],
        cwd=ROOT,
        env=kept | environment,
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=300,
        check=False,
    )


def write(logbook: Path, *commands: str) -> None:
    for command in ("new", "vehicle add van --carrier diesel --capacity 70", *commands):
        done = run(logbook, *command.split())
        assert done.returncode == 0, done.stderr


def test_each_vehicle_in_turn_and_one_json_object() -> None:
    told = json.loads(run(DEMO, "review", "--month", "2026-10", "--grid-factor", "300", "--json").stdout)
    assert [one["vehicle"] for one in told["reviews"]] == ["van", "car", "electric"]
    electric = told["reviews"][2]["carbon"][0]
    assert electric["kg"] == pytest.approx(0.3 * electric["energy"])
    assert all(one["level"]["interval"][0] < one["level"]["consumption"] for one in told["reviews"])


def test_the_answer_comes_first_and_a_part_is_paid_back() -> None:
    part = "roof fairing and side skirts"
    done = run(DEMO, "review", "--vehicle", "van", "--month", "2026-10", "--part-cost", f"{part}=900", NO_COLOR="1")
    assert (done.returncode, done.stderr) == (0, "")
    lines = done.stdout.splitlines()
    assert lines[0].startswith("van in 2026-10: 4,138 km at 8.99 L/100 km as measured.")
    assert max(map(len, lines)) <= 80
    assert "\x1b" not in done.stdout
    assert "900 EUR paid back" in " ".join(done.stdout.split())
    assert done.stdout.isascii()


def test_electricity_without_a_grid_factor_says_what_to_give() -> None:
    done = run(DEMO, "review", "--vehicle", "electric", "--month", "2026-10")
    assert "not stated: give --grid-factor" in done.stdout


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--month", "2026-13"), "'2026-13' is no month: write it as YYYY-MM"),
        (("--month", "november"), "is no month"),
        (("--month", "9000-01"), "9000-01 has not begun: today is"),
        (("--month", "2019-05"), "has no entry in 2019-05: its entries run from 2024-12-02"),
        (("--part-cost", "roof"), "is not written as NAME=NUMBER"),
        (("--part-cost", "roof=9"), "no modification named 'roof'"),
        (("--co2", "coal=1"), "unknown carrier 'coal'"),
        (("--co2", "diesel=-1"), "must be 0 or more"),
        (("--grid-factor", "3,5"), "decimal comma"),
        (("--vehicle", "bus"), "van"),
    ],
)
def test_refusals_are_one_line_and_status_1(words: tuple[str, ...], said: str) -> None:
    named = () if "--vehicle" in words else ("--vehicle", "van")
    done = run(DEMO, "review", *named, *words)
    assert (done.returncode, done.stdout) == (1, "")
    assert said in done.stderr
    assert len(done.stderr.splitlines()) == 1


def test_a_part_that_no_vehicle_has_is_refused_for_several_vehicles_too() -> None:
    done = run(DEMO, "review", "--month", "2026-10", "--part-cost", "rof=9")
    assert (done.returncode, done.stdout) == (1, "")
    assert "no modification named 'rof'" in done.stderr


def test_a_vehicle_bought_this_month(tmp_path: Path) -> None:
    book = tmp_path / "a.logbook"
    write(book)
    assert "there is no entry yet" in run(book, "review").stderr
    write(tmp_path / "b.logbook", "fillup 1000 40 --date 2026-11-03", "fillup 1500 42 --date 2026-11-13")
    done = run(tmp_path / "b.logbook", "review")
    assert done.returncode == 0
    said = " ".join(done.stdout.split())
    assert said.startswith("van in 2026-11: 500 km at 8.40 L/100 km as measured. Too early for more:")
    assert "6 full tanks or charges" in said


def test_currencies_are_not_added_up_and_the_entries_are_named(tmp_path: Path) -> None:
    book = tmp_path / "a.logbook"
    write(
        book,
        "fillup 1000 40 --date 2026-11-03 --cost 60 --currency EUR",
        "fillup 1500 42 --date 2026-11-13 --cost 70 --currency CHF",
    )
    said = " ".join(run(book, "review").stdout.split())
    assert "costs in several currencies are not added up (EUR: 2026-11-03; CHF: 2026-11-13)" in said
    assert "130" not in said


@pytest.mark.parametrize("option", ["--vehicle", "--grid-factor", "--co2", "--part-cost"])
def test_a_fleet_takes_no_options_of_one_vehicle(option: str) -> None:
    done = run(DEMO, "review", "--fleet", option, "van")
    assert (done.returncode, done.stdout) == (2, "")
    assert "--fleet takes no" in done.stderr


def test_a_fleet_is_one_table() -> None:
    told = json.loads(run(DEMO, "review", "--fleet", "--month", "2026-10", "--json").stdout)
    assert {each["vehicle"] for each in told["vehicles"]} == {"van", "car", "electric"}


def test_a_factor_kept_in_the_logbook_counts_unless_another_is_stated(tmp_path: Path) -> None:
    book = tmp_path / "a.logbook"
    write(
        book,
        "vehicle add cart --carrier electricity --capacity 50 --co2 0.35",
        "charge 1000 20 --vehicle cart --date 2026-11-03",
        "charge 1200 40 --vehicle cart --date 2026-11-13",
    )
    asked = ("review", "--vehicle", "cart", "--json")
    kept, stated = (json.loads(run(book, *asked, *more).stdout) for more in ((), ("--grid-factor", "100")))
    assert kept["reviews"][0]["carbon"][0]["kg"] == pytest.approx(0.35 * 40)
    assert stated["reviews"][0]["carbon"][0]["kg"] == pytest.approx(0.1 * 40)
    done = run(book, "export", str(tmp_path / "out"))
    assert done.returncode == 0, done.stderr
    assert json.loads(run(tmp_path / "out", *asked).stdout) == kept


def test_factors_below_nothing_are_refused(tmp_path: Path) -> None:
    book = tmp_path / "a.logbook"
    write(book)
    for words in (("--co2", "-1"), ("--second-co2", "0.3"), ("--co2", "much")):
        done = run(book, "vehicle", "add", "car", "--carrier", "petrol", *words)
        assert (done.returncode, len(done.stderr.splitlines())) == (1, 1)


def test_one_vehicle_without_that_month_does_not_hide_the_others(tmp_path: Path) -> None:
    book = tmp_path / "a.logbook"
    write(
        book,
        "vehicle add car --carrier petrol",
        "fillup 1000 40 --vehicle van --date 2026-11-03",
        "fillup 1000 40 --vehicle car --date 2026-10-03",
    )
    done = run(book, "review", "--month", "2026-11")
    assert done.returncode == 1
    assert done.stdout.startswith("van in 2026-11")
    assert "car has no entry in 2026-11" in done.stderr
