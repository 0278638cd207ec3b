"""Tables in and out: every value by its column, every problem by its line, and nothing hostile gets far."""

from __future__ import annotations

import datetime as dt
import math
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from energytrack.errors import EntryError, LogbookError
from energytrack.logbook.cells import CellError, date_reader, number_reader, yes_or_no
from energytrack.logbook.columns import Form
from energytrack.logbook.csvfile import COLUMN_LIMIT, LINE_LIMIT
from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather
from energytrack.logbook.tables import (
    read_entries,
    read_events,
    read_modifications,
    read_vehicles,
    read_weather,
    write_entries,
    write_events,
    write_modifications,
    write_vehicles,
    write_weather,
)

VAN = Form(vehicle="van")


def _file(folder: Path, text: str | bytes, name: str = "entries.csv") -> Path:
    path = folder / name
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path


def test_every_column_of_entries(tmp_path: Path) -> None:
    path = _file(
        tmp_path,
        "vehicle,date,odometer_km,energy,kind,full,level_percent,missed,distance_km,cost,currency,temperature_c,"
        "speed_kmh,place,note,payload_kg\n"
        'van,2026-05-03,48230,41.32,fill-up,no,40,yes,612.5,70.2,EUR,-3.5,94,North yard,"wind, rain",250\n',
    )
    reading = read_entries(path)
    assert reading.problems == []
    assert reading.notes == []
    expected = Entry(
        vehicle="van",
        date=dt.date(2026, 5, 3),
        energy=41.32,
        odometer_km=48230.0,
        kind="fill-up",
        full=False,
        level_percent=40.0,
        missed=True,
        distance_km=612.5,
        cost=70.2,
        currency="EUR",
        temperature_c=-3.5,
        speed_kmh=94.0,
        place="North yard",
        note="wind, rain",
        extra={"payload_kg": 250.0},
    )
    assert reading.rows == [(2, expected)]


def test_optional_columns_may_be_absent_and_cells_empty(tmp_path: Path) -> None:
    reading = read_entries(_file(tmp_path, "date,odometer_km,energy\n2026-05-03,100,\n2026-05-04,200,8\n"), VAN)
    assert reading.problems == []
    first, second = (entry for _, entry in reading.rows)
    assert math.isnan(first.energy)
    assert (second.full, second.missed, second.kind, second.note) == (True, False, "fill-up", "")


def test_columns_of_numbers_are_kept_and_others_left_out_with_one_note(tmp_path: Path) -> None:
    text = "date,odometer_km,energy,payload_kg,driver,empty\n2026-05-03,100,8,250,Ada,\n2026-05-04,200,8,,Bo,\n"
    reading = read_entries(_file(tmp_path, text), VAN)
    assert [dict(entry.extra) for _, entry in reading.rows] == [{"payload_kg": 250.0}, {}]
    assert reading.notes == ["column driver left out: 'Ada' in line 2 is not a number"]


def test_every_problem_is_told_at_once_with_its_line(tmp_path: Path) -> None:
    text = (
        "date,odometer_km,energy,level_percent,full\n"
        "2026-05-03,100,8,,\n"
        "2026-02-30,200,8,,\n"  # line 3
        '2026-05-05,300,"8,5",,\n'
        "2026-05-06,400,0,120,maybe\n"
        "\n"
        ",500,8,,\n"  # line 7: the empty line counts
        "2026-05-08,600\n"
        "2026-05-09,nan,inf,,\n"
        "2026-05-10,,,,\n"
        '2026-05-11,700,8,,"yes\n'
        '"\n'
        "2026-05-12,800,-8,,\n"  # line 13: the row before takes two lines
    )
    reading = read_entries(_file(tmp_path, text), VAN)
    told = {problem.line: problem.message for problem in reading.problems}
    assert sorted(told) == [3, 4, 5, 7, 8, 9, 10, 13]
    assert "not a day of the calendar" in told[3]
    assert "write 8.5" in told[4]
    assert told[5].count(";") >= 2  # energy, level and full, all of them
    assert "no date" in told[7]
    assert "2 cells where the header has 5" in told[8]
    assert "'nan' is not a number" in told[9]
    assert "'inf' is not a number" in told[9]
    assert "neither energy nor odometer nor distance" in told[10]
    assert "more than 0" in told[13]
    assert [line for line, _ in reading.rows] == [2, 11]
    assert all(problem.file.endswith("entries.csv") for problem in reading.problems)


def test_missing_columns_are_named_with_what_the_file_has_and_what_to_type(tmp_path: Path) -> None:
    reading = read_entries(_file(tmp_path, "Datum;Liter;Stand\n03.05.2026;8;100\n"), VAN)
    assert not reading.whole
    (problem,) = reading.problems
    assert "has no date, energy, odometer_km (odometer_km or distance_km)" in problem.message
    assert "'Datum', 'Liter', 'Stand'" in problem.message
    assert "--column date=... --column energy=... --column odometer_km=..." in problem.message


@pytest.mark.parametrize("mark", [",", ";", "\t"])
def test_delimiter_is_found_in_the_header(tmp_path: Path, mark: str) -> None:
    text = mark.join(["date", "odometer_km", "energy"]) + "\n" + mark.join(["2026-05-03", "100", "8"]) + "\n"
    assert [entry.energy for _, entry in read_entries(_file(tmp_path, text), VAN).rows] == [8.0]


@pytest.mark.parametrize(("encoding", "noted"), [("utf-8", False), ("utf-8-sig", False), ("cp1252", True)])
def test_encodings(tmp_path: Path, encoding: str, noted: bool) -> None:
    path = _file(tmp_path, "date,odometer_km,energy,note\n2026-05-03,100,8,Größe 5 €\n".encode(encoding))
    reading = read_entries(path, VAN)
    assert [entry.note for _, entry in reading.rows] == ["Größe 5 €"]
    assert reading.notes == (["entries.csv is not UTF-8; read as cp1252"] if noted else [])


def test_bytes_that_windows_leaves_undefined_are_latin_1(tmp_path: Path) -> None:
    reading = read_entries(_file(tmp_path, b"date,odometer_km,energy,note\n2026-05-03,100,8,\xe4\x81\n"), VAN)
    assert [entry.note for _, entry in reading.rows] == ["ä"]  # U+0081 is a control character: not kept
    assert reading.notes == ["entries.csv is not UTF-8; read as latin-1"]


def test_control_characters_never_reach_a_record(tmp_path: Path) -> None:
    text = "date,odometer_km,energy,note\n2026-05-03,100,8,\x1b[31mred\x07\n"
    ((_, entry),) = read_entries(_file(tmp_path, text), VAN).rows
    assert entry.note == "[31mred"


def test_numbers() -> None:
    plain, comma = number_reader(), number_reader(decimal_comma=True)
    assert [plain(text) for text in ("41.32", "+5", "-.5", "5.", "1e-3")] == [41.32, 5.0, -0.5, 5.0, 0.001]
    assert comma("41,32") == 41.32
    assert number_reader(thousands=",")("1,234,567.8") == 1234567.8
    assert number_reader(decimal_comma=True, thousands=".")("1.234,5") == 1234.5
    assert number_reader(thousands=" ")("1\u202f234") == 1234.0
    assert number_reader(thousands="'")("1'234") == 1234.0
    for text in ("1,234", "41,32", "nan", "inf", "1_000", "٣", "0x10", "", "4 L", "1e999", "9" * 400):
        with pytest.raises(CellError):
            plain(text)
    for text in ("1,23", "12,34,567", "1,2345"):
        with pytest.raises(CellError):
            number_reader(thousands=",")(text)
    with pytest.raises(CellError):
        comma("41.32")


def test_dates() -> None:
    day = dt.date(2025, 12, 31)
    read, day_first = date_reader(), date_reader(day_first=True)
    for text in ("2025-12-31", "31.12.2025", "31/12/2025", "12/31/2025", "2025-12-31T23:59", "31.12.2025 10:15"):
        assert read(text) == day
    assert read("05/05/2025") == dt.date(2025, 5, 5)  # the same either way
    assert day_first("03/04/2025") == dt.date(2025, 4, 3)
    assert date_reader(date_format="%m/%d/%y")("03/04/25") == dt.date(2025, 3, 4)
    with pytest.raises(CellError, match=r"two ways.*--day-first"):
        read("03/04/2025")
    with pytest.raises(CellError):
        day_first("12/31/2025")
    for text in ("2025-13-01", "2025-02-29", "31.12.25", "20251231", "yesterday", "12.2025", "31.12/2025"):
        with pytest.raises(CellError):
            read(text)
    with pytest.raises(CellError):
        date_reader(date_format="%d.%m")


def test_yes_and_no() -> None:
    assert all(yes_or_no(text) for text in ("yes", "Y", "true", "1"))
    assert not any(yes_or_no(text) for text in ("no", "N", "FALSE", "0"))
    with pytest.raises(CellError):
        yes_or_no("full")


def test_units_of_the_file(tmp_path: Path) -> None:
    """Factors: NIST SP 811 (2008), appendix B.8; 1 US gallon = 3.785411784 L, 1 mile = 1.609344 km; 50 F = 10 C."""
    form = Form(vehicle="van", km=1.609344, kmh=1.609344, energy=3.785411784, fahrenheit=True)
    text = "date,odometer_km,energy,distance_km,temperature_c,speed_kmh\n2026-05-03,1000,10,100,50,60\n"
    ((_, entry),) = read_entries(_file(tmp_path, text), form).rows
    assert entry.odometer_km == pytest.approx(1609.344, rel=1e-12)
    assert entry.distance_km == pytest.approx(160.9344, rel=1e-12)
    assert entry.energy == pytest.approx(37.85411784, rel=1e-12)
    assert entry.speed_kmh == pytest.approx(96.56064, rel=1e-12)
    assert entry.temperature_c == pytest.approx(10.0, rel=1e-12)


def test_marks_that_cannot_be_are_refused() -> None:
    for wrong in ({"thousands": "."}, {"thousands": ",", "decimal_comma": True}, {"date_format": "%d"}):
        with pytest.raises(EntryError):
            Form(**wrong)  # type: ignore[arg-type]


HEADER = b"date,odometer_km,energy,note\n"
HOSTILE = {
    "nul": HEADER + b"2026-05-03,100,8,\x00\n",
    "utf-16": HEADER.decode().encode("utf-16"),
    "long cell": HEADER + b"2026-05-03,100,8," + b"x" * 10_000_000 + b"\n",
    "long cell, short lines": HEADER + b'2026-05-03,100,8,"' + b"x\n" * 5_000_000 + b'"\n',
    "quote never closed": HEADER + b'2026-05-03,100,8,"abc\n2026-05-04,200,8,\n',
    "a million columns": b"," * 1_000_000 + b"\n2026-05-03\n",
    "many columns": b",".join(b"c%d" % i for i in range(COLUMN_LIMIT + 1)) + b"\n",
    "endless line": b"x" * (LINE_LIMIT + 1),
    "empty": b"",
    "only a bom": b"\xef\xbb\xbf",
    "names twice": b"date,date,odometer_km,energy\n",
}


@pytest.mark.parametrize("content", HOSTILE.values(), ids=HOSTILE.keys())
def test_hostile_files_are_one_problem_of_one_line(tmp_path: Path, content: bytes) -> None:
    reading = read_entries(_file(tmp_path, content), VAN)
    assert not reading.whole
    (problem,) = reading.problems
    assert "\n" not in str(problem)
    assert len(problem.message) < 300


def test_what_is_no_file(tmp_path: Path) -> None:
    for path in (tmp_path, tmp_path / "absent.csv"):
        reading = read_entries(path, VAN)
        assert not reading.whole
        assert len(reading.problems) == 1


def test_other_tables_say_what_is_wrong(tmp_path: Path) -> None:
    vehicles = read_vehicles(_file(tmp_path, "vehicle,carrier,capacity\nvan,diesel,70\nvan,petrol,\nbus,steam,\n"))
    assert [vehicle for _, vehicle in vehicles.rows] == [Vehicle("van", "diesel", "L", 70.0)]
    assert [problem.line for problem in vehicles.problems] == [4, 3]
    second = "vehicle,carrier,second_carrier,second_capacity\n"
    second += "van,petrol,electricity,11\nbus,petrol,,11\ncar,petrol,lpg,\n"
    hybrids = read_vehicles(_file(tmp_path, second))
    assert [vehicle.second_unit for _, vehicle in hybrids.rows] == ["kWh"]
    assert [problem.line for problem in hybrids.problems] == [3, 4]
    text = "vehicle,name,fitted_date,removed_date\nvan,skirts,2026-05-03,2026-04-01\nvan,skirts,,\nvan,,2026-05-03,\n"
    modifications = read_modifications(_file(tmp_path, text))
    assert [problem.line for problem in modifications.problems] == [2, 3, 4]
    known = "vehicle,name,fitted_km,known_low_percent,known_high_percent\n" + "".join(
        f"van,windows,1,{ends}\n" for ends in ("4,9", "9,4", "-4,9", "0,9", "4,", "-9,-4", "4,900")
    )
    changes = read_modifications(_file(tmp_path, known))
    assert [change.known for _, change in changes.rows] == [(4.0, 9.0), (-9.0, -4.0)]
    told = {problem.line: problem.message for problem in changes.problems}
    assert sorted(told) == [3, 4, 5, 6, 8]
    assert "the lower number comes first, 4:9" in told[3]
    events = read_events(_file(tmp_path, "vehicle,date,what,odometer_factor\nvan,2026-05-03,tyres,1.02\nvan,,x,9\n"))
    assert [event for _, event in events.rows] == [Event("van", dt.date(2026, 5, 3), "tyres", None, 1.02)]
    assert [problem.line for problem in events.problems] == [3]
    weather = read_weather(_file(tmp_path, "date,temperature_c\n2026-05-03,75\n2026-05-04,\n2026-05-05,7.5\n"))
    assert [day for _, day in weather.rows] == [Weather(dt.date(2026, 5, 5), 7.5)]
    assert "--temperature-unit F" in weather.problems[0].message


TEXT = st.text(st.characters(exclude_categories=["Cc", "Cs", "Zl", "Zp"]), max_size=12).map(str.strip)
NAME = TEXT.filter(bool)
AMOUNT = st.floats(1e-3, 1e6)
DATE = st.dates(dt.date(1950, 1, 1), dt.date(2100, 1, 1))


def _optional(values: st.SearchStrategy[float]) -> st.SearchStrategy[float | None]:
    return st.none() | values


ENTRIES = st.builds(
    Entry,
    vehicle=NAME,
    date=DATE,
    energy=AMOUNT,
    odometer_km=_optional(AMOUNT),
    kind=st.sampled_from(["fill-up", "charge"]),
    full=st.booleans(),
    level_percent=_optional(st.floats(0, 100)),
    missed=st.booleans(),
    distance_km=_optional(AMOUNT),
    cost=_optional(st.floats(0, 1e6)),
    currency=st.sampled_from([None, "EUR", "USD"]),
    temperature_c=_optional(st.floats(-50, 50)),
    speed_kmh=_optional(st.floats(1, 200)),
    place=TEXT,
    note=TEXT,
    confirmed=st.booleans(),
    extra=st.dictionaries(st.sampled_from(["payload_kg", "rain"]), st.floats(-1e6, 1e6), max_size=2),
)
MODIFICATIONS = st.builds(
    Modification,
    vehicle=NAME,
    name=NAME,
    fitted_date=DATE,
    fitted_km=_optional(AMOUNT),
    level=_optional(st.floats(-10, 10)),
    target_percent=_optional(st.floats(0.1, 50)),
    note=TEXT,
    known=st.sampled_from([None, (4.0, 9.0), (-8.5, -3.0), (5.0, 5.0)]),
    reversible=st.booleans(),
)
EVENTS = st.builds(Event, NAME, DATE, NAME, _optional(AMOUNT), _optional(st.floats(0.9, 1.1)), TEXT)
VEHICLES = st.builds(
    Vehicle,
    name=NAME,
    carrier=st.sampled_from(["petrol", "diesel"]),
    unit=st.just("L"),
    capacity=_optional(AMOUNT),
    distance_unit=st.sampled_from(["km", "mi"]),
    display=st.sampled_from([None, "mpg-us"]),
    note=TEXT,
    typed_unit=st.sampled_from([None, "gal-us"]),
    second_carrier=st.just("electricity"),
    second_unit=st.just("kWh"),
    second_capacity=_optional(AMOUNT),
)
WEATHER = st.builds(Weather, DATE, st.floats(-50, 50))


@settings(max_examples=150, deadline=None)
@given(
    entries=st.lists(ENTRIES, max_size=5),
    modifications=st.lists(MODIFICATIONS, max_size=5),
    events=st.lists(EVENTS, max_size=5),
    vehicles=st.lists(VEHICLES, max_size=5, unique_by=lambda vehicle: vehicle.name),
    weather=st.lists(WEATHER, max_size=5, unique_by=lambda day: day.date),
)
def test_what_is_written_is_read_back(
    tmp_path_factory: pytest.TempPathFactory,
    entries: list[Entry],
    modifications: list[Modification],
    events: list[Event],
    vehicles: list[Vehicle],
    weather: list[Weather],
) -> None:
    folder = tmp_path_factory.mktemp("tables")
    for records, write, read in (
        (entries, write_entries, read_entries),
        (modifications, write_modifications, read_modifications),
        (events, write_events, read_events),
        (vehicles, write_vehicles, read_vehicles),
        (weather, write_weather, read_weather),
    ):
        path = folder / f"{write.__name__}.csv"
        write(path, records)  # type: ignore[operator]
        reading = read(path)  # type: ignore[operator]
        assert reading.problems == []
        assert [record for _, record in reading.rows] == records


def test_writing_never_overwrites(tmp_path: Path) -> None:
    path = _file(tmp_path, "mine")
    with pytest.raises(LogbookError, match="exists already"):
        write_weather(path, [])
    assert path.read_text() == "mine"
