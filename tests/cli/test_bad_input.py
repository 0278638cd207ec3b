"""What cannot be, typed or in a table: refused in one clear line, and nothing changed."""

from __future__ import annotations

import datetime as dt
import sqlite3
from contextlib import closing
from pathlib import Path

import pytest

from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Vehicle, Weather
from tests.cli.test_plan import run

STATED = ("plan", "--trip-noise", "4")
HEADER = "vehicle,name,fitted_km,level,target_percent"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """my.logbook with a van and ten fill-ups, and `tables` with the same van."""
    book = open_logbook(tmp_path / "my.logbook", create=True)
    book.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    entries = [Entry("van", dt.date(2024, 1, 1) + dt.timedelta(7 * k), 40.0, 1_000 + 500.0 * k) for k in range(10)]
    book.add_entries([(entry, {}) for entry in entries], source="test")
    book.add_weather([Weather(dt.date(2024, 1, 9), 3.0)])
    tables = tmp_path / "tables"
    tables.mkdir()
    rows = [f"van,{entry.date},{entry.odometer_km:.0f},{entry.energy}" for entry in entries]
    written(tables / "vehicles.csv", "vehicle,carrier,unit,capacity", "van,diesel,L,70")
    written(tables / "entries.csv", "vehicle,date,odometer_km,energy", *rows)
    return tmp_path


def written(path: Path, *lines: str) -> None:
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def contents(logbook: Path) -> list[str]:
    with closing(sqlite3.connect(logbook)) as connection:
        return list(connection.iterdump())


def refused(folder: Path, *words: str, said: str, logbook: str | None = "my.logbook") -> None:
    """One line on standard error, exit 1, no answer, and the logbook as it was."""
    before = contents(folder / "my.logbook")
    done = run(*words, folder=folder, logbook=logbook)
    assert (done.returncode, done.stdout) == (1, ""), done.stdout
    assert len(done.stderr.splitlines()) == 1
    assert said in done.stderr
    assert contents(folder / "my.logbook") == before


@pytest.mark.parametrize(("level", "said"), [("two", "not a number"), ("2,4", "write 2.4"), ("nan", "not a number")])
def test_a_level_is_a_number(folder: Path, level: str, said: str) -> None:
    refused(folder, "mod", "fitted", "wing", "5600", f"--level={level}", said=said)


@pytest.mark.parametrize(
    ("cells", "said"),
    [
        ("two,3", "modifications.csv:2: level 'two' is not a number"),
        ("inf,3", "modifications.csv:2: level 'inf' is not a number"),
        ("2.4,0", "modifications.csv:2: target_percent '0': a target is more than 0"),
        ("2.4,60", "modifications.csv:2: target_percent '60': a target is at most 50 %"),
    ],
)
def test_levels_and_targets_of_a_table(folder: Path, cells: str, said: str) -> None:
    written(folder / "tables" / "modifications.csv", HEADER, f"van,wing,3000,{cells}")
    refused(folder, "enough", said=said, logbook="tables")
    refused(folder, "import", "tables", said=said)


@pytest.mark.parametrize("target", ["0", "-3", "50.1"])
def test_targets_out_of_range(folder: Path, target: str) -> None:
    refused(folder, "mod", "fitted", "wing", "5600", f"--target={target}", said=f"target {target} is not above 0")
    refused(folder, *STATED, f"--target={target}", said=f"not {target}: try 3", logbook=None)


def test_targets_out_of_range_of_a_logged_part(folder: Path) -> None:
    written(folder / "tables" / "modifications.csv", HEADER, "van,wing,3000,,3")
    refused(folder, "enough", "--target", "0", said="the target must lie above 0", logbook="tables")
    refused(folder, "rehearse", "--target", "51", said="not 51: try 3", logbook="tables")


def test_what_no_question_can_be_asked_with_is_said_once(folder: Path) -> None:
    """One line, however many parts were asked about."""
    written(folder / "tables" / "modifications.csv", HEADER, "van,wing,3000,,3", "van,skirts,4000,,3")
    for words in (("enough", "--target", "0"), ("enough", "--confidence", "2"), ("rehearse", "-n", "0")):
        refused(folder, *words, said="energytrack: the " if "2" not in words else "confidence", logbook="tables")


def test_a_plan_needs_a_log_or_the_noise(folder: Path) -> None:
    refused(folder, "plan", said="no logbook named, and no noise stated", logbook=None)
    refused(folder, "plan", "--drift", "1", said="no noise stated", logbook=None)
    refused(folder, "plan", "--trip-noise", "0", said="of 0 cannot be: state more than 0, 100 at most", logbook=None)
    refused(folder, *STATED, "--drift=-1", said="drift of -1 cannot be: state 0 or more", logbook=None)


@pytest.mark.parametrize("second", ["2024-02-01,4", "2024-02-01,6"])
def test_a_day_that_stands_twice(folder: Path, second: str) -> None:
    """Equal or contradicting: the file, both lines, and what to do."""
    written(folder / "w.csv", "date,temperature_c", "2024-02-01,4", "2024-02-02,5", second)
    said = "w.csv:4: 2024-02-01 stands in line 2 already; keep one of the two"
    refused(folder, "weather", "w.csv", said=said)
    written(folder / "tables" / "weather.csv", *(folder / "w.csv").read_text(encoding="utf-8").splitlines())
    refused(folder, "plan", said="weather.csv:4: 2024-02-01 stands in line 2 already", logbook="tables")


def test_a_value_that_stands_twice_in_a_station_file(folder: Path) -> None:
    written(folder / "w.csv", *(f"XX000000001,20240201,TAVG,{tenths},,,S," for tenths in (40, 60)))
    refused(folder, "weather", "w.csv", said="w.csv:2: TAVG of 2024-02-01 stands in line 1 already")


def test_a_weather_file_without_any_temperature(folder: Path) -> None:
    written(folder / "w.csv", "date,temperature_c", "2024-02-01,")
    refused(folder, "weather", "w.csv", said="has no day with a temperature")
    written(folder / "w.csv", "XX000000001,20240201,TAVG,-9999,,,S,")
    refused(folder, "weather", "w.csv", said="has no day with a temperature")


@pytest.mark.parametrize(
    "lines",
    [
        ("date,temperature_c", "2024-02-01,4", "2024-02-02,", "2024-02-04,5"),
        tuple(f"XX000000001,2024020{day},TAVG,{tenths},,,S," for day, tenths in ((1, 40), (2, -9999), (4, 50))),
    ],
)
def test_gaps_are_counted_and_what_becomes_of_them_is_said(folder: Path, lines: tuple[str, ...]) -> None:
    """Days left out, empty cells and the missing value of GHCN-Daily alike: two days have no temperature."""
    written(folder / "w.csv", *lines)
    done = run("weather", "w.csv", folder=folder, logbook="my.logbook")
    assert (done.returncode, done.stderr) == (0, "")
    (note,) = [line for line in done.stdout.splitlines() if line.startswith("note: ")]
    assert note.startswith("note: 2 days are missing between 2024-02-01 and 2024-02-04, such as 2024-02-02 to 2024-02")
    assert note.endswith("is filled in from the vehicle's other temperatures")


def test_another_temperature_for_a_known_day_is_said(folder: Path) -> None:
    written(folder / "w.csv", "date,temperature_c", "2024-01-09,4")
    done = run("weather", "w.csv", folder=folder, logbook="my.logbook")
    assert "note: 1 day had another temperature in this logbook, which is replaced" in done.stdout.splitlines()
