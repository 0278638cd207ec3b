"""Weather files: a table of days, and the three layouts of GHCN-Daily.

The layouts are those of the readme of GHCN-Daily (NOAA National Centers for Environmental Information), written down
from memory. Stations and values are invented.
"""

from __future__ import annotations

import datetime as dt
from pathlib import Path

import pytest

from energytrack.errors import EntryError
from energytrack.logbook.columns import Form
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.rejected import BadRowsError
from energytrack.logbook.store import Store
from energytrack.logbook.weather_files import read_weather_file
from energytrack.logbook.weather_import import import_weather

STATION = "XX000000001"
AS_IT_IS = Form()


def day(number: int, month: int = 2) -> dt.date:
    return dt.date(2024, month, number)


def fixed_line(element: str, values: dict[int, int], flags: dict[int, str] | None = None, month: int = 2) -> str:
    """Columns 1-11 ID, 12-15 YEAR, 16-17 MONTH, 18-21 ELEMENT, then 31 times VALUE (5), MFLAG, QFLAG, SFLAG."""
    cells = (f"{values.get(k, -9999):5d} {(flags or {}).get(k, ' ')}S" for k in range(1, 32))
    return f"{STATION}2024{month:02d}{element}" + "".join(cells)


def written(folder: Path, name: str, *lines: str) -> Path:
    path = folder / name
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def temperatures(path: Path, form: Form = AS_IT_IS, station: str | None = None) -> dict[dt.date, float]:
    reading = read_weather_file(path, form, station)
    assert reading.problems == []
    return {weather.date: weather.temperature_c for _, weather in reading.rows}


def test_fixed_width_takes_the_mean_or_the_middle_of_the_extremes(tmp_path: Path) -> None:
    path = written(
        tmp_path, "station.dly",
        fixed_line("TMAX", {1: 100, 2: 120, 3: 50}),
        fixed_line("TMIN", {1: 20, 2: -15}),
        fixed_line("PRCP", {1: 31}),
        fixed_line("TAVG", {2: 48}),
    )  # fmt: skip
    assert len(fixed_line("TMAX", {})) == 269  # length of a line in the published files
    assert temperatures(path) == {day(1): 6.0, day(2): 4.8}


def test_a_value_with_a_quality_flag_is_left_out(tmp_path: Path) -> None:
    path = written(tmp_path, "station.dly", fixed_line("TAVG", {1: 50, 2: 999}, {2: "G"}))
    reading = read_weather_file(path, AS_IT_IS)
    assert [weather.date for _, weather in reading.rows] == [day(1)]
    assert "1 value with a quality flag left out" in reading.notes


@pytest.mark.parametrize("header", [(), ("ID,DATE,ELEMENT,DATA_VALUE,M_FLAG,Q_FLAG,S_FLAG,OBS_TIME",)])
def test_one_value_a_row_with_or_without_a_header(tmp_path: Path, header: tuple[str, ...]) -> None:
    rows = (
        f"{STATION},20240201,TMAX,100,,,S,0700",
        f"{STATION},20240201,TMIN,20,,,S,0700",
        f"{STATION},20240202,TAVG,-31,H,,S,",
        f"{STATION},20240203,TAVG,-31,H,D,S,",
        f"{STATION},20240203,SNOW,12,,,S,",
    )
    assert temperatures(written(tmp_path, "values.csv", *header, *rows)) == {day(1): 6.0, day(2): -3.1}


def test_one_day_a_row(tmp_path: Path) -> None:
    path = written(
        tmp_path, "days.csv",
        '"STATION","DATE","LATITUDE","NAME","TAVG","TAVG_ATTRIBUTES","TMAX","TMAX_ATTRIBUTES","TMIN"',
        f'"{STATION}","2024-02-01","1.0","NOWHERE, XX","   35","H,,S","  100",",,S","   20"',
        f'"{STATION}","2024-02-02","1.0","NOWHERE, XX","","","  100",",,S","   20"',
        f'"{STATION}","2024-02-03","1.0","NOWHERE, XX","","","  100",",G,S","   20"',
    )  # fmt: skip
    assert temperatures(path) == {day(1): 3.5, day(2): 6.0}


def test_days_in_whole_degrees_are_told_by_their_decimal_point_or_unit(tmp_path: Path) -> None:
    metric = written(tmp_path, "metric.csv", "STATION,DATE,TMAX,TMIN", f"{STATION},2024-02-01,10.0,2.0")
    fahrenheit = written(tmp_path, "f.csv", "STATION,DATE,TMAX,TMIN", f"{STATION},2024-02-01,50,32")
    assert temperatures(metric) == {day(1): 6.0}
    assert temperatures(fahrenheit, Form(fahrenheit=True)) == {day(1): 5.0}


def test_several_stations_need_a_choice(tmp_path: Path) -> None:
    path = written(
        tmp_path, "2024.csv", f"{STATION},20240201,TAVG,10,,,S,", "XX000000002,20240201,TAVG,90,,,S,"
    )
    reading = read_weather_file(path, AS_IT_IS)
    assert not reading.whole
    assert "say which with --station" in reading.problems[-1].message
    assert temperatures(path, station="XX000000002") == {day(1): 9.0}
    assert "no day with a temperature of station XX9" in read_weather_file(path, AS_IT_IS, "XX9").problems[-1].message


def test_plain_table_of_means_or_extremes(tmp_path: Path) -> None:
    means = written(tmp_path, "means.csv", "date,temperature_c", "2024-02-01,4.5", "2024-02-02,")
    extremes = written(tmp_path, "extremes.csv", "Tag;Tief;Hoch", "01.02.2024;-2,0;6,0")
    told = {"date": "Tag", "minimum_c": "Tief", "maximum_c": "Hoch"}
    assert temperatures(means) == {day(1): 4.5}
    assert temperatures(extremes, Form(columns=told, day_first=True, decimal_comma=True)) == {day(1): 2.0}


@pytest.mark.parametrize(
    ("lines", "line", "said"),
    [
        (("date,temperature_c", "2024-02-01,4", "2024-02-01,5"), 3, "stands in line 2 already"),
        (("date,temperature_c", "2024-02-01,400"), 2, "no outside temperature"),
        (("date,minimum_c,maximum_c", "2024-02-01,9,4"), 2, "above its maximum_c"),
        (("date,rain", "2024-02-01,9"), 1, "has no temperature_c"),
        ((f"{STATION},20240231,TAVG,10,,,S,",), 1, "is no day"),
        ((f"{STATION},20240201,TAVG,1x,,,S,",), 1, "no temperature in tenths"),
        ((f"{STATION},20240201,TAVG,10,,,S,", f"{STATION},20240201,TAVG,10,,,S,"), 2, "stands in line 1 already"),
        ((f"{STATION},20240201,TAVG,9990,,,S,",), 1, "no outside temperature"),
        ((fixed_line("TAVG", {30: 10}),), 1, "is no day"),
        ((fixed_line("TAVG", {1: 10}), "nonsense"), 2, "no line of this format"),
    ],
)
def test_what_is_wrong_is_told_by_its_line(tmp_path: Path, lines: tuple[str, ...], line: int, said: str) -> None:
    reading = read_weather_file(written(tmp_path, "bad.csv", *lines), AS_IT_IS)
    assert [problem.line for problem in reading.problems] == [line]
    assert said in reading.problems[0].message


def test_gaps_are_noted(tmp_path: Path) -> None:
    path = written(tmp_path, "w.csv", "date,temperature_c", "2024-02-01,4", "2024-02-05,4", "2024-02-07,4")
    assert read_weather_file(path, AS_IT_IS).notes == [
        "4 days are missing between 2024-02-01 and 2024-02-07, such as 2024-02-02 to 2024-02-04: an entry without a "
        "day of its own there is filled in from the vehicle's other temperatures"
    ]


@pytest.fixture
def store(tmp_path: Path) -> Store:
    store = open_logbook(tmp_path / "my.logbook", create=True)
    store.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    for number, temperature in ((1, 5.0), (6, None), (11, None)):
        store.add_entry(Entry("van", day(number), 40.0, 1000.0 + 100 * number, temperature_c=temperature), {})
    return store


def test_import_is_done_once_and_says_which_entries_it_reaches(store: Store, tmp_path: Path) -> None:
    path = written(tmp_path, "station.dly", fixed_line("TAVG", {3: 50, 4: 60}))
    first = import_weather(store, path, AS_IT_IS)
    assert (first.new, first.already, first.first, first.last) == (2, 0, "2024-02-03", "2024-02-04")
    assert first.lines()[-1] == "van: 2 of 3 entries have a temperature, 1 of them from the weather"
    second = import_weather(store, path, AS_IT_IS)
    assert (second.new, second.already) == (0, 2)
    assert len(store.weather()) == 2


def test_a_bad_row_changes_nothing_unless_it_is_left_out(store: Store, tmp_path: Path) -> None:
    path = written(tmp_path, "w.csv", "date,temperature_c", "2024-02-01,4", "2024-02-02,x")
    with pytest.raises(BadRowsError, match=r"w\.csv:3"):
        import_weather(store, path, AS_IT_IS)
    assert store.weather() == []
    outcome = import_weather(store, path, AS_IT_IS, skip_bad=True)
    assert (outcome.new, len(outcome.left_out)) == (1, 1)


def test_a_file_that_is_not_there_is_refused(store: Store, tmp_path: Path) -> None:
    with pytest.raises(EntryError, match="does not exist"):
        import_weather(store, tmp_path / "none.csv", AS_IT_IS)
