"""`import` as a process, on a logbook file: exit status, what is said where, and what is in the logbook afterwards."""

from __future__ import annotations

import json
import math
import os
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest

from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store

HEADER = "date,odometer_km,energy\n"
TWO_ROWS = HEADER + "2026-01-05,1000,40\n2026-01-12,1600,38.5\n"


def _run(folder: Path, *arguments: str, logbook: str = "my.logbook") -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "energytrack", "--logbook", logbook, *arguments]
    root = str(Path(__file__).parents[2])
    environment = {**os.environ, "PYTHONPATH": root, "PYTHONIOENCODING": "utf-8"}
    done = subprocess.run(
        command, cwd=folder, env=environment, capture_output=True, text=True, encoding="utf-8", timeout=120, check=False
    )
    assert "Traceback" not in done.stderr
    return done


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    assert _run(tmp_path, "new").returncode == 0
    assert _run(tmp_path, "vehicle", "add", "van", "--carrier", "diesel", "--capacity", "70").returncode == 0
    return tmp_path


def _write(folder: Path, content: str | bytes, name: str = "log.csv") -> str:
    (folder / name).write_bytes(content.encode() if isinstance(content, str) else content)
    return name


def _entries(folder: Path, vehicle: str = "van") -> list[Entry]:
    store = Store(folder / "my.logbook")
    try:
        return store.entries(vehicle)
    finally:
        store.close()


def test_our_own_columns_need_no_telling(folder: Path) -> None:
    done = _run(folder, "import", _write(folder, TWO_ROWS))
    assert (done.returncode, done.stdout, done.stderr) == (0, "log.csv: 2 new, 0 already there\n", "")
    assert [(str(e.date), e.odometer_km, e.energy) for e in _entries(folder)] == [
        ("2026-01-05", 1000.0, 40.0),
        ("2026-01-12", 1600.0, 38.5),
    ]
    again = _run(folder, "import", "log.csv")
    assert (again.returncode, again.stdout) == (0, "log.csv: 0 new, 2 already there\n")


def test_bad_rows_are_all_told_and_nothing_is_imported(folder: Path) -> None:
    _write(folder, TWO_ROWS + '2026-01-13,1500,40\n2026-01-20,2200,"38,1"\n03/04/2026,2300,20\n2026-01-27,,\n')
    done = _run(folder, "import", "log.csv")
    assert done.returncode == 1
    assert done.stdout == ""
    lines = done.stderr.splitlines()
    assert [line.split(":")[1] for line in lines[:4]] == ["4", "5", "6", "7"]
    assert "1500 km on 2026-01-13 does not fit after 1600 km" in lines[0]
    assert "write 38.1" in lines[1]
    assert "--day-first" in lines[2]
    assert lines[4].startswith("energytrack: log.csv: 4 bad rows, in lines 4, 5, 6, 7; nothing was imported")
    assert len(lines) == 5
    assert _entries(folder) == []


def test_skip_bad_writes_the_rest_aside(folder: Path) -> None:
    _write(folder, TWO_ROWS + "2026-01-20,2200,x\n2026-01-27,2800,41\n")
    done = _run(folder, "import", "log.csv", "--skip-bad", "rejected.csv", "--json")
    assert done.returncode == 0
    told = json.loads(done.stdout)
    assert (told["new"], told["already"]) == ({"entries": 3}, {"entries": 0})
    assert [row["line"] for row in told["rejected"]] == [4]
    assert (folder / "rejected.csv").read_text().splitlines()[1].startswith("2026-01-20,2200,x,")
    assert [entry.missed for entry in _entries(folder)] == [False, False, True]
    _write(folder, TWO_ROWS + "2026-02-20,2200,x\n", "other.csv")
    refused = _run(folder, "import", "other.csv", "--skip-bad", "rejected.csv")
    assert refused.returncode == 1
    assert "exists already" in refused.stderr
    assert len(_entries(folder)) == 3


@pytest.mark.parametrize(("encoding", "said"), [("utf-8-sig", ""), ("latin-1", "read as cp1252"), ("utf-16", "")])
def test_foreign_columns_decimal_commas_and_encodings(folder: Path, encoding: str, said: str) -> None:
    text = "Datum;Kilometerstand;Liter;Ort\n03.04.2026;12.345,5;41,32;Köln\n10.04.2026;13.001;39;Köln\n"
    _write(folder, text.replace("Köln", "Südhof").encode(encoding))
    columns = ["date=Datum", "odometer_km=Kilometerstand", "energy=Liter", "place=Ort"]
    options = [part for column in columns for part in ("--column", column)]
    stated = ["--encoding", "utf-16"] if encoding == "utf-16" else []
    form = ["--day-first", "--decimal-comma", "--thousands", ".", *stated]
    done = _run(folder, "import", "log.csv", *options, *form)
    assert (done.returncode, done.stderr) == (0, "")
    assert said in done.stdout
    first, second = _entries(folder)
    assert (str(first.date), first.odometer_km, first.energy, first.place) == ("2026-04-03", 12345.5, 41.32, "Südhof")
    assert second.odometer_km == 13001.0


def test_miles_and_gallons(folder: Path) -> None:
    """NIST SP 811 (2008), appendix B.8: 1 US gallon = 3.785411784 L, 1 mile = 1.609344 km. 59 F = 15 C."""
    text = "day,miles,gallons,F,mph\n12/31/2025,1000,10,59,60\n01/31/2026,1350.5,12.5,,\n"
    columns = ["date=day", "odometer_km=miles", "energy=gallons", "temperature_c=F", "speed_kmh=mph"]
    options = [part for column in columns for part in ("--column", column)]
    units = ["--odometer-unit", "mi", "--energy-unit", "gal-us", "--temperature-unit", "F", "--speed-unit", "mph"]
    done = _run(folder, "import", _write(folder, text), *options, *units)
    assert (done.returncode, done.stderr) == (0, "")
    first, second = _entries(folder)
    assert first.odometer_km == pytest.approx(1609.344, rel=1e-12)
    assert first.energy == pytest.approx(37.85411784, rel=1e-12)
    assert first.temperature_c == pytest.approx(15.0, rel=1e-12)
    assert first.speed_kmh == pytest.approx(96.56064, rel=1e-12)
    assert second.odometer_km == pytest.approx(2173.4190720, rel=1e-12)
    assert str(second.date) == "2026-01-31"
    with closing(sqlite3.connect(folder / "my.logbook")) as connection:
        typed = json.loads(connection.execute("SELECT typed FROM entry ORDER BY id").fetchone()[0])
    assert typed == {"odometer_km": "1000 mi", "energy": "10 gal-us", "temperature_c": "59 F", "speed_kmh": "60 mph"}


def test_import_loads_nothing_heavy(folder: Path) -> None:
    name = _write(folder, TWO_ROWS)
    code = (
        "import sys; sys.argv = ['energytrack', '--logbook', 'my.logbook', 'import', sys.argv[1]]\n"
        "from energytrack.cli.app import main\n"
        "try: main()\n"
        "except SystemExit: pass\n"
        "print(sorted({'numpy', 'pandas', 'scipy', 'statsmodels', 'rich'} & set(sys.modules)))\n"
    )
    environment = {**os.environ, "PYTHONPATH": str(Path(__file__).parents[2])}
    command = [sys.executable, "-c", code, name]
    done = subprocess.run(command, cwd=folder, env=environment, capture_output=True, text=True, timeout=120, check=True)
    assert done.stdout.splitlines() == ["log.csv: 2 new, 0 already there", "[]"]


def test_one_command_starts_logbook_and_vehicle(tmp_path: Path) -> None:
    _write(tmp_path, "date,distance_km,kwh\n2026-01-05,30.5,4.4\n2026-01-05,28,\n2026-01-06,,5\n")
    options = ["--vehicle", "car", "--carrier", "electricity", "--column", "energy=kwh", "--kind", "charge"]
    done = _run(tmp_path, "import", "log.csv", *options)
    assert (done.returncode, done.stdout) == (0, "log.csv: 3 new, 0 already there\n")
    entries = _entries(tmp_path, "car")
    assert [entry.kind for entry in entries] == ["charge"] * 3
    assert math.isnan(entries[1].energy)
    assert [entry.distance_km for entry in entries] == [30.5, 28.0, None]


def test_missing_columns_say_what_to_type(folder: Path) -> None:
    done = _run(folder, "import", _write(folder, "date,km,litres\n2026-01-05,1000,40\n"))
    assert done.returncode == 1
    assert done.stderr == (
        "energytrack: log.csv:1: has no energy, odometer_km (odometer_km or distance_km); it has 'date', 'km', "
        "'litres'. Name them: --column energy=... --column odometer_km=...\n"
    )


@pytest.mark.parametrize(
    "arguments",
    [
        ["--column", "energy"],
        ["--column", "energy=a", "--column", "energy=b"],
        ["--odometer-unit", "furlong"],
        ["--energy-unit", "barrel"],
        ["--table", "vehicles"],
        ["--kind", "sip"],
        ["--carrier", "diesel"],
        ["--capacity", "70"],
        ["--unknown"],
    ],
)
def test_wrong_usage(folder: Path, arguments: list[str]) -> None:
    assert _run(folder, "import", _write(folder, TWO_ROWS), *arguments).returncode == 2
    assert _entries(folder) == []


HOSTILE = {
    "nul": HEADER.encode() + b"2026-01-05,1000,40\x00\n",
    "long cell": HEADER.encode() + b"2026-01-05,1000," + b"9" * 10_000_000 + b"\n",
    "quote never closed": HEADER.encode() + b'2026-01-05,1000,40\n2026-01-12,"1600,38\n' + b"2026,1,1\n" * 1000,
    "a million columns": b"date,odometer_km,energy" + b"," * 1_000_000 + b"\n",
    "escapes": b"date,odometer_km,energy\n2026-01-05,1000,\x1b[2J\x07\xff\n",
    "binary": bytes(range(256)) * 100,
    "empty": b"",
}


@pytest.mark.parametrize("content", HOSTILE.values(), ids=HOSTILE.keys())
def test_hostile_files_cost_one_line(folder: Path, content: bytes) -> None:
    done = _run(folder, "import", _write(folder, content))
    assert done.returncode == 1
    assert done.stdout == ""
    assert len(done.stderr.splitlines()) == 1
    assert len(done.stderr) < 500
    assert done.stderr.strip().isprintable()
    assert _entries(folder) == []


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("2026-01-05,1e308,40", "beyond anything measured"),
        ("2026-01-05,5e9,40", "no odometer value"),
        ("0001-01-01,1000,40", "before 1900"),
        ("2999-01-01,1000,40", "future"),
        ("2026-01-05,1000,92", "1.3 times the capacity"),
        ("2026-01-05,-1,40", "not below 0"),
        ("2026-01-05,1000,nan", "not a number"),
        ("2026-01-05,1000,40,1", "4 cells where the header has 3"),
    ],
)
def test_one_bad_value_is_one_line_with_file_and_line(folder: Path, text: str, said: str) -> None:
    done = _run(folder, "import", _write(folder, HEADER + text + "\n"))
    assert done.returncode == 1
    assert done.stderr.startswith("energytrack: log.csv:2: ")
    assert said in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert len(done.stderr) < 300
    assert _entries(folder) == []


def test_a_new_vehicle_is_kept_as_it_is_logged(tmp_path: Path) -> None:
    _write(tmp_path, HEADER + "2026-01-05,1000,10\n")
    units = ["--odometer-unit", "mi", "--energy-unit", "gal-us", "--capacity", "20"]
    done = _run(tmp_path, "import", "log.csv", "--vehicle", "car", "--carrier", "petrol", *units)
    assert done.returncode == 0
    store = Store(tmp_path / "my.logbook")
    vehicle = store.vehicle("car")
    store.close()
    assert (vehicle.unit, vehicle.typed_unit, vehicle.distance_unit, vehicle.display) == ("L", "gal-us", "mi", "mpg-us")
    assert vehicle.capacity == pytest.approx(20 * 3.785411784, rel=1e-12)
    for wrong in (["--carrier", "steam"], ["--carrier", "petrol", "--capacity", "0"]):
        refused = _run(tmp_path, "import", "log.csv", "--vehicle", "other", *wrong)
        assert refused.returncode == 1
        assert len(refused.stderr.splitlines()) == 1


def test_a_folder_of_tables_is_refused_as_a_place_to_write(folder: Path) -> None:
    (folder / "tables").mkdir()
    _write(folder / "tables", "vehicle,carrier\nvan,diesel\n", "vehicles.csv")
    _write(folder / "tables", "vehicle," + TWO_ROWS.replace("\n2026", "\nvan,2026"), "entries.csv")
    refused = _run(folder, "import", _write(folder, TWO_ROWS), logbook="tables")
    assert refused.returncode == 1
    assert "read-only" in refused.stderr
    done = _run(folder, "import", "tables")
    assert done.returncode == 0
    assert "tables, entries: 2 new, 0 already there" in done.stdout
    assert len(_entries(folder)) == 2


def test_two_imports_at_once_add_each_row_once(folder: Path) -> None:
    months = [(year, month) for year in range(2000, 2026) for month in range(1, 13)]
    rows = [f"{year}-{month:02}-01,{(year - 2000) * 8400 + month * 700},40\n" for year, month in months]
    _write(folder, HEADER + "".join(rows))
    command = [sys.executable, "-m", "energytrack", "--logbook", "my.logbook", "import", "log.csv"]
    environment = {**os.environ, "PYTHONPATH": str(Path(__file__).parents[2])}
    start = {"cwd": folder, "env": environment, "stdout": subprocess.PIPE, "text": True}
    running = [subprocess.Popen(command, **start) for _ in range(3)]  # type: ignore[call-overload]
    said = [process.communicate(timeout=120)[0] for process in running]
    assert [process.returncode for process in running] == [0, 0, 0]
    assert sum(int(line.split(": ")[1].split()[0]) for line in said) == len(months)
    assert len(_entries(folder)) == len(months)
