"""Importing: in driving order, only once, all or nothing, and what cannot be true is told by its line."""

from __future__ import annotations

import datetime as dt
import random
from pathlib import Path

import pytest

from energytrack.errors import EntryError, LogbookError, UnknownNameError
from energytrack.logbook.columns import Form
from energytrack.logbook.folder import Folder
from energytrack.logbook.importing import Outcome, Request, run_import
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather
from energytrack.logbook.rejected import BadRowsError
from energytrack.logbook.store import Store
from energytrack.logbook.tables import (
    write_entries,
    write_events,
    write_modifications,
    write_vehicles,
    write_weather,
)

TODAY = dt.date(2026, 12, 31)
VAN = Vehicle("van", "diesel", "L", 70.0)
HEADER = "date,odometer_km,energy"


@pytest.fixture
def logbook(tmp_path: Path) -> Path:
    path = tmp_path / "my.logbook"
    store = Store.create(path)
    store.add_vehicle(VAN)
    store.close()
    return path


def _file(folder: Path, *lines: str, name: str = "log.csv") -> Path:
    path = folder / name
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def _import(logbook: Path, path: Path, **request: object) -> Outcome:
    return run_import(Request(path, **{"form": Form(), "vehicle": "van"} | request), logbook, TODAY)  # type: ignore[arg-type]


def _entries(logbook: Path, vehicle: str = "van") -> list[Entry]:
    store = open_logbook(logbook)
    try:
        return store.entries(vehicle)
    finally:
        if isinstance(store, Store):
            store.close()


def _bad(logbook: Path, path: Path, **request: object) -> dict[int | None, str]:
    before = _entries(logbook)
    with pytest.raises(BadRowsError) as refused:
        _import(logbook, path, **request)
    assert _entries(logbook) == before
    return {problem.line: problem.message for problem in refused.value.problems}


def test_twice_adds_nothing_and_a_longer_export_its_new_rows(tmp_path: Path, logbook: Path) -> None:
    rows = [f"2026-05-{day:02},{day * 100},8.{day}" for day in range(1, 10)]
    assert _import(logbook, _file(tmp_path, HEADER, *rows[:6])).new == {"entries": 6}
    again = _import(logbook, _file(tmp_path, HEADER, *rows[:6]))
    assert (again.new, again.already) == ({"entries": 0}, {"entries": 6})
    longer = _import(logbook, _file(tmp_path, HEADER, *rows[2:]))
    assert (longer.new, longer.already) == ({"entries": 3}, {"entries": 4})
    assert [entry.odometer_km for entry in _entries(logbook)] == [day * 100.0 for day in range(1, 10)]


def test_equal_rows_count_as_often_as_they_occur(tmp_path: Path, logbook: Path) -> None:
    """Two equal trips on one day are two trips."""
    rows = ["date,distance_km,energy", "2026-05-03,20,1.5", "2026-05-03,20,1.5"]
    assert _import(logbook, _file(tmp_path, *rows)).new == {"entries": 2}
    third = _import(logbook, _file(tmp_path, *rows, "2026-05-03,20,1.5"))
    assert (third.new, third.already) == ({"entries": 1}, {"entries": 2})


def test_what_was_typed_is_not_added_by_its_own_export(tmp_path: Path, logbook: Path) -> None:
    store = Store(logbook)
    store.add_entry(Entry("van", dt.date(2026, 5, 3), 41.32, odometer_km=48230.0, note="typed"), {})
    write_entries(tmp_path / "out.csv", store.entries("van"))
    store.close()
    assert _import(logbook, tmp_path / "out.csv").already == {"entries": 1}
    assert len(_entries(logbook)) == 1


def test_one_bad_row_and_nothing_is_imported(tmp_path: Path, logbook: Path) -> None:
    path = _file(
        tmp_path,
        HEADER,
        "2026-05-01,1000,40",
        "2026-05-02,1500,0",  # 3: no energy
        "2026-05-03,1400,40",
        "2026-05-04,900,40",  # 5: odometer going back
        "2026-05-05,1800,92",  # 6: more than 1.3 times the tank of 70 L
        "2026-05-06,2200,40",
        "2027-01-01,2600,40",  # 8: after today
        "2026-05-08,99999,40",  # 9: a typing error blames itself, not all that follow
        "2026-05-09,3000,40",
        "2026-05-10,3500,40",
        "2026-05-11,3500,41",  # 12: standing still
    )
    told = _bad(logbook, path)
    assert sorted(told, key=str) == sorted([3, 5, 6, 8, 9, 12], key=str)
    assert "does not fit after 1400 km on 2026-05-03 (line 4) and before 2200 km on 2026-05-06 (line 7)" in told[5]
    assert "1.3 times the capacity" in told[6]  # the tank of the van holds 70 L
    assert "future" in told[8]
    assert "99999" in told[9]


def test_several_entries_at_one_odometer_value_if_meant(tmp_path: Path, logbook: Path) -> None:
    path = _file(tmp_path, HEADER, "2026-05-01,1000,40", "2026-05-01,1000,12")
    assert list(_bad(logbook, path)) == [3]
    assert _import(logbook, path, again=True).new == {"entries": 2}


def test_skip_bad_keeps_the_good_rows_and_marks_the_gap(tmp_path: Path, logbook: Path) -> None:
    rows = ["2026-05-01,1000,40,A", "2026-05-02,1500,x,B", "2026-05-03,2000,38,C"]
    path = _file(tmp_path, "date,odometer_km,energy,driver", *rows)
    rejected = tmp_path / "rejected.csv"
    outcome = _import(logbook, path, skip_bad=rejected)
    assert outcome.new == {"entries": 2}
    assert [problem.line for problem in outcome.rejected] == [3]
    header, row = rejected.read_text(encoding="utf-8").splitlines()
    assert header == "date,odometer_km,energy,driver,reason"
    assert row.startswith("2026-05-02,1500,x,B,")
    assert "is not a number" in row
    assert [entry.missed for entry in _entries(logbook)] == [False, True]


def test_a_rejected_duplicate_leaves_no_gap(tmp_path: Path, logbook: Path) -> None:
    rows = ["2026-05-01,1000,40", "2026-05-03,1500,41", "2026-05-03,1500,41", "2026-05-05,2000,39"]
    outcome = _import(logbook, _file(tmp_path, HEADER, *rows), skip_bad=tmp_path / "rejected.csv")
    assert [problem.line for problem in outcome.rejected] == [4]
    assert [entry.missed for entry in _entries(logbook)] == [False] * 3
    assert outcome.notes == []


def test_another_amount_where_the_logbook_has_an_entry_leaves_no_gap(tmp_path: Path, logbook: Path) -> None:
    _import(logbook, _file(tmp_path, HEADER, "2026-05-01,1000,40", "2026-05-03,1500,41"))
    longer = _file(tmp_path, HEADER, "2026-05-01,1000,40", "2026-05-03,1500,42", "2026-05-05,2000,39")
    outcome = _import(logbook, longer, skip_bad=tmp_path / "rejected.csv")
    assert [problem.line for problem in outcome.rejected] == [3]
    assert [entry.missed for entry in _entries(logbook)] == [False] * 3


def test_the_file_of_rejected_rows_is_never_overwritten(tmp_path: Path, logbook: Path) -> None:
    path = _file(tmp_path, HEADER, "2026-05-01,1000,40", "2026-05-02,1500,x")
    taken = _file(tmp_path, "mine", name="rejected.csv")
    link = tmp_path / "link.csv"
    link.symlink_to(tmp_path / "elsewhere.csv")
    for target in (taken, link):
        with pytest.raises(EntryError, match="exists already"):
            _import(logbook, path, skip_bad=target)
    assert taken.read_text() == "mine\n"
    assert not (tmp_path / "elsewhere.csv").exists()
    assert _entries(logbook) == []


def test_nothing_rejected_means_no_file(tmp_path: Path, logbook: Path) -> None:
    outcome = _import(logbook, _file(tmp_path, HEADER, "2026-05-01,1000,40"), skip_bad=tmp_path / "rejected.csv")
    assert outcome.rejected_file is None
    assert not (tmp_path / "rejected.csv").exists()


def test_rows_that_contradict_the_logbook_are_bad_and_forgotten_receipts_fit(tmp_path: Path, logbook: Path) -> None:
    _import(logbook, _file(tmp_path, HEADER, "2026-05-01,1000,40", "2026-05-10,2000,40"))
    path = _file(tmp_path, HEADER, "2026-05-05,1500,20", "2026-05-06,2500,20")
    told = _bad(logbook, path)
    assert list(told) == [3]
    assert "before 2000 km on 2026-05-10 in the logbook" in told[3]
    told = _bad(logbook, _file(tmp_path, HEADER, "2026-05-10,2000,39"))
    assert "another entry at 2000 km" in told[2]
    told = _bad(logbook, _file(tmp_path, HEADER, "2026-05-12,90000,40"))
    assert "a jump no vehicle drives" in told[2]
    assert _import(logbook, _file(tmp_path, HEADER, "2026-05-05,1500,20")).new == {"entries": 1}
    assert [entry.odometer_km for entry in _entries(logbook)] == [1000.0, 1500.0, 2000.0]


def test_without_odometer_the_file_gives_the_order(tmp_path: Path, logbook: Path) -> None:
    rows = ["2026-05-01,300,20", "2026-05-02,,15", "2026-05-02,310,21", "2026-05-04,290,19"]
    _import(logbook, _file(tmp_path, "date,distance_km,energy", *rows))
    assert [entry.energy for entry in _entries(logbook)] == [20.0, 15.0, 21.0, 19.0]
    assert _entries(logbook)[1].distance_km is None  # a lost trip reading: the amount still counts


def test_a_file_with_the_newest_first_is_read_from_the_bottom(tmp_path: Path, logbook: Path) -> None:
    rows = ["2026-05-04,290,19", "2026-05-02,310,21", "2026-05-02,,15", "2026-05-01,300,20"]
    outcome = _import(logbook, _file(tmp_path, "date,distance_km,energy", *rows))
    assert [entry.energy for entry in _entries(logbook)] == [20.0, 15.0, 21.0, 19.0]
    assert "the newest entry stands first; read from the bottom up" in outcome.notes


def test_a_date_going_back_without_odometer_is_bad(tmp_path: Path, logbook: Path) -> None:
    rows = ["2026-05-01,300,20", "2026-05-02,310,21", "2025-05-03,290,19", "2026-05-04,300,22"]
    told = _bad(logbook, _file(tmp_path, "date,distance_km,energy", *rows))
    assert list(told) == [4]
    assert "after 2026-05-02 (line 3) and before 2026-05-04 (line 5)" in told[4]


def test_shuffled_rows_with_odometer_end_in_driving_order(tmp_path: Path, logbook: Path) -> None:
    rows = [f"2026-{1 + day // 28:02}-{1 + day % 28:02},{1000 + 90 * day},8" for day in range(200)]
    random.Random(5).shuffle(rows)
    assert _import(logbook, _file(tmp_path, HEADER, *rows)).new == {"entries": 200}
    readings = [entry.odometer_km for entry in _entries(logbook)]
    assert readings == [1000.0 + 90 * day for day in range(200)]


def test_a_new_vehicle_and_a_new_logbook_with_one_request(tmp_path: Path) -> None:
    path = _file(tmp_path, "date,distance_km,energy", "2026-05-01,30,5")
    logbook = tmp_path / "new.logbook"
    car = Vehicle("car", "electricity", "kWh", 50.0)
    _import(logbook, path, vehicle="car", new_vehicle=car)
    assert [entry.kind for entry in _entries(logbook, "car")] == ["charge"]  # electricity is charged
    other = Vehicle("car", "petrol", "L")
    with pytest.raises(EntryError, match="already, with electricity"):
        _import(logbook, path, vehicle="car", new_vehicle=other)


def test_a_refused_import_starts_no_logbook(tmp_path: Path) -> None:
    path = _file(tmp_path, "date,distance_km,energy", "2026-05-01,30,-5")
    with pytest.raises(BadRowsError):
        _import(tmp_path / "new.logbook", path, new_vehicle=VAN)
    assert not (tmp_path / "new.logbook").exists()


def test_vehicles_of_the_file(tmp_path: Path, logbook: Path) -> None:
    path = _file(tmp_path, "vehicle,date,odometer_km,energy", "van,2026-05-01,100,9", "bus,2026-05-01,900,9")
    with pytest.raises(UnknownNameError, match="'bus'"):
        _import(logbook, path, vehicle=None)
    with pytest.raises(EntryError, match="several vehicles"):
        _import(logbook, path)
    one = _file(tmp_path, "vehicle,date,odometer_km,energy", "Our Van,2026-05-01,100,9")
    assert _import(logbook, one).new == {"entries": 1}  # named: whatever the file calls it
    with pytest.raises(UnknownNameError, match="--carrier"):
        _import(logbook, one, vehicle="bus")


def test_units_that_do_not_fit_the_vehicle_are_refused(tmp_path: Path, logbook: Path) -> None:
    path = _file(tmp_path, HEADER, "2026-05-01,100,9")
    with pytest.raises(EntryError, match="counted in L, not in kWh"):
        _import(logbook, path, energy_unit="kWh")


def _folder(path: Path) -> Path:
    path.mkdir()
    write_vehicles(path / "vehicles.csv", [VAN, Vehicle("car", "electricity", "kWh")])
    entries = [Entry("van", dt.date(2026, 5, day), 40.0, odometer_km=day * 500.0) for day in range(1, 8)]
    entries.append(Entry("car", dt.date(2026, 5, 1), 20.0, odometer_km=100.0, kind="charge", level_percent=80.0))
    write_entries(path / "entries.csv", entries)
    modifications = [
        Modification("van", "skirts", dt.date(2026, 5, 2), 1000.0, dt.date(2026, 5, 4), 2000.0),
        Modification("van", "skirts", dt.date(2026, 5, 6), 3000.0, target_percent=3.0),
    ]
    write_modifications(path / "modifications.csv", modifications)
    write_events(path / "events.csv", [Event("van", dt.date(2026, 5, 3), "tyres", 1500.0, 1.02)])
    write_weather(path / "weather.csv", [Weather(dt.date(2026, 5, 3), 7.5), Weather(dt.date(2026, 5, 2), 8.0)])
    return path


def test_a_folder_is_a_logbook_that_is_only_read(tmp_path: Path) -> None:
    folder = open_logbook(_folder(tmp_path / "tables"))
    assert isinstance(folder, Folder)
    assert not folder.writable
    assert [vehicle.name for vehicle in folder.vehicles()] == ["van", "car"]
    assert [entry.odometer_km for entry in folder.last_entries("van", 2)] == [3000.0, 3500.0]
    assert len(folder.modifications("van")) == 2
    assert folder.events("car") == []
    assert [day.temperature_c for day in folder.weather()] == [8.0, 7.5]
    assert folder.assessments("van") == []
    with pytest.raises(UnknownNameError, match="van, car"):
        folder.entries("bus")
    with pytest.raises(LogbookError, match=r"read-only.*import"):
        folder.add_vehicle(VAN)


def test_a_folder_with_bad_rows_says_which(tmp_path: Path) -> None:
    path = _folder(tmp_path / "tables")
    lines = (path / "entries.csv").read_text().splitlines()
    lines += ["bus,2026-05-01,1,1" + "," * 12] + ["van,2026-05-09,x,1" + "," * 12] * 8
    (path / "entries.csv").write_text("\n".join(lines) + "\n")
    with pytest.raises(LogbookError, match=r"entries.csv:10: no vehicle 'bus'.*and 4 more problems"):
        Folder(path).entries("van")
    (path / "vehicles.csv").unlink()
    with pytest.raises(LogbookError, match=r"no vehicles\.csv"):
        open_logbook(path)


def test_a_folder_goes_into_a_logbook_once_and_comes_out_the_same(tmp_path: Path) -> None:
    path, logbook = _folder(tmp_path / "tables"), tmp_path / "my.logbook"
    Store.create(logbook).close()
    request = Request(path, Form())
    first = run_import(request, logbook, TODAY)
    assert first.new == {"vehicles": 2, "entries": 8, "modifications": 2, "events": 1, "weather": 2}
    second = run_import(request, logbook, TODAY)
    assert second.new == dict.fromkeys(first.new, 0)
    assert second.already == first.new
    folder, store = Folder(path), Store(logbook)
    for name in ("van", "car"):
        assert store.modifications(name) == folder.modifications(name)
        assert store.events(name) == folder.events(name)
        stored = [(e.date, e.odometer_km, e.energy, e.kind, e.level_percent) for e in store.entries(name)]
        assert stored == [(e.date, e.odometer_km, e.energy, e.kind, e.level_percent) for e in folder.entries(name)]
    assert store.weather() == folder.weather()
    store.close()


def test_a_folder_is_not_written_by_an_import(tmp_path: Path) -> None:
    path = _folder(tmp_path / "tables")
    with pytest.raises(LogbookError, match="read-only"):
        _import(path, _file(tmp_path, HEADER, "2026-05-20,9000,9"))


def test_other_tables_on_their_own(tmp_path: Path, logbook: Path) -> None:
    path = _file(tmp_path, "name,fitted_date,target_percent", "skirts,2026-05-03,3", "skirts,,")
    with pytest.raises(BadRowsError, match=":3:"):
        _import(logbook, path, table="modifications")
    _file(tmp_path, "name,fitted_date,target_percent", "skirts,2026-05-03,3")
    assert _import(logbook, path, table="modifications").new == {"modifications": 1}
    assert _import(logbook, path, table="modifications").new == {"modifications": 0}
    weather = _file(tmp_path, "Tag;Mittel", "03.05.2026;7,5", name="weather.csv")
    form = Form(columns={"date": "Tag", "temperature_c": "Mittel"}, decimal_comma=True, day_first=True)
    assert _import(logbook, weather, table="weather", form=form).new == {"weather": 1}
    store = Store(logbook)
    assert store.weather() == [Weather(dt.date(2026, 5, 3), 7.5)]
    store.close()
