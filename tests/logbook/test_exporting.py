"""A logbook out and in again: to the byte, and with nothing a spreadsheet would run.

Outside: RFC 4180 for the tables; the Data Package standard, version 2 (datapackage.org, 2024), of which the required
fields are checked here from memory of its text; the list of leading characters a spreadsheet takes for a formula is
that of OWASP's page on CSV injection, from memory.
"""

from __future__ import annotations

import csv
import datetime as dt
import hashlib
import json
import os
import stat
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from energytrack.errors import EntryError, LogbookError
from energytrack.logbook import revisions
from energytrack.logbook.columns import Form
from energytrack.logbook.exporting import export
from energytrack.logbook.folder import Folder
from energytrack.logbook.formulas import neutralised, restored
from energytrack.logbook.importing import Outcome, Request, run_import
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Event, Vehicle, Weather
from energytrack.logbook.store import Store

DAY = dt.date(2026, 5, 3)
FORMULA = "=1+1"
LEADING = "=+-@\t\r"


def bring_in(store: Store, folder: Path) -> Outcome:
    return run_import(Request(folder, Form()), store.path, DAY + dt.timedelta(days=100))


def contents(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


@pytest.fixture
def store(tmp_path: Path) -> Store:
    """Two vehicles, a part, an event, weather; entries amended, struck and confirmed."""
    made = Store.create(tmp_path / "my.logbook")
    made.add_vehicle(Vehicle("van", "diesel", "L", 70.0, note="=van"))
    made.add_vehicle(Vehicle("@hybrid", "petrol", "L", 40.0, second_carrier="electricity", second_unit="kWh"))
    for n in range(6):
        entry = Entry("van", DAY + dt.timedelta(days=n), 40.1 + n, 1_000.0 + 500 * n, note=FORMULA, place="pump")
        made.add_entry(replace(entry, extra={"payload": 10.5}) if n else entry, {"note": FORMULA})
    made.add_entry(Entry("@hybrid", DAY, 8.0, 10.0, "charge", level_percent=80.0), {})
    made.confirm(2)
    revisions.amend(made, replace(made.entry("van", 3), energy=41.0), {}, "-2 was typed")
    revisions.strike(made, made.entry("van", 4), "twice")
    made.fit("van", "+skirts", None, 1_700.0, 3.0, -2.4, "left first")
    made.add_event(Event("van", DAY, "winter tyres", 1_200.0, 1.02, "worn"))
    made.add_weather([Weather(DAY, -3.5)])
    made.keep_assessment("van", "+skirts", {"verdict": "not-yet", "modification": "+skirts"})
    made.record_look("van", "+skirts", 2_000.0, DAY)
    revisions.undo(made)
    return made


def test_out_and_in_and_out_is_the_same_to_the_byte(store: Store, tmp_path: Path) -> None:
    export(store, tmp_path / "one")
    again = Store.create(tmp_path / "again.logbook")
    outcome = bring_in(again, tmp_path / "one")
    export(again, tmp_path / "two")
    assert contents(tmp_path / "one") == contents(tmp_path / "two")
    assert outcome.new["entry"] == 9
    for table in ("change", "entry", "switch", "event", "weather", "confirmation", "look", "assessment", "vehicle"):
        rows = store.query(f"SELECT * FROM {table}")
        assert rows == again.query(f"SELECT * FROM {table}")
        assert rows, table
    assert bring_in(again, tmp_path / "two").new["entries"] == 0


ANY_TEXT = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\x00"), max_size=12)
NASTY = st.sampled_from([*LEADING, "'", "'=1", "''", "a\rb", 'a"b', "a\nb", " a ", ",", ""]) | ANY_TEXT
AMOUNTS = st.floats(1e-3, 1e3)
STEPS = st.lists(st.tuples(st.sampled_from(["log", "amend", "strike", "undo", "event"]), NASTY, AMOUNTS), max_size=6)


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.sampled_from(["van", "=van", "'van", "@", "-1"]), NASTY, STEPS)
@example("=van", "\r", [("log", "'", 1.0), ("amend", "'=", 2.0), ("amend", "", 3.0), ("strike", "", 1.0)])
def test_whatever_was_logged_comes_back(
    tmp_path_factory: pytest.TempPathFactory, name: str, note: str, steps: list[tuple[str, str, float]]
) -> None:
    folder = tmp_path_factory.mktemp("steps")
    store = Store.create(folder / "my.logbook")
    store.add_vehicle(Vehicle(name, "diesel", "L", note=note, display=note or None))
    for n, (what, text, amount) in enumerate(steps):
        standing = store.entries(name)
        try:
            if what == "log":
                extra = {text: amount} if text else {}
                entry = Entry(name, DAY + dt.timedelta(days=n), amount, 500.0 * n, place=text, note=note, extra=extra)
                store.add_entry(entry, {"amount": text})
            elif what == "event":
                store.add_event(Event(name, DAY, text, note=note))
            elif what == "undo":
                revisions.undo(store, text)
            elif what == "amend" and standing:
                revisions.amend(store, replace(standing[-1], energy=amount, currency=text), {}, text)
            elif standing:
                revisions.strike(store, standing[0], text)
        except (EntryError, LogbookError):
            pass
    export(store, folder / "one")
    again = Store.create(folder / "again.logbook")
    bring_in(again, folder / "one")
    assert again.entries(name) == store.entries(name)
    export(again, folder / "two")
    assert contents(folder / "one") == contents(folder / "two")
    store.close()
    again.close()


@given(NASTY)
def test_text_made_inert_comes_back(text: str) -> None:
    assert not neutralised(text).startswith(tuple(LEADING))
    assert restored(neutralised(text)) == text


def test_no_cell_of_an_export_begins_like_a_formula(store: Store, tmp_path: Path) -> None:
    export(store, tmp_path / "out")
    seen = 0
    for path in (tmp_path / "out").rglob("*.csv"):
        for row in csv.reader(path.open(encoding="utf-8", newline="")):
            for cell in row:
                seen += cell.startswith("'")
                if cell.startswith(tuple(LEADING)):
                    float(cell)  # a negative number is one, and runs nothing
    assert seen >= 10


def test_the_folder_is_a_logbook_to_read(store: Store, tmp_path: Path) -> None:
    export(store, tmp_path / "out")
    folder = open_logbook(tmp_path / "out")
    assert isinstance(folder, Folder)
    assert folder.vehicles() == [replace(each, typed_unit=None) for each in store.vehicles()]
    assert [replace(each, id=None) for each in store.entries("van")] == folder.entries("van")
    assert folder.modifications("van") == store.modifications("van")
    assert folder.events("van") == store.events("van")
    assert folder.weather() == store.weather()


def test_the_descriptor_says_what_the_standard_asks_for(store: Store, tmp_path: Path) -> None:
    export(store, tmp_path / "out")
    package: dict[str, Any] = json.loads((tmp_path / "out" / "datapackage.json").read_text(encoding="utf-8"))
    assert package["$schema"] == "https://datapackage.org/profiles/2.0/datapackage.json"
    resources = package["resources"]
    assert len(resources) == len({each["name"] for each in resources}) == 5 + 10  # at least one, names unique
    assert {each["path"] for each in resources} == set(contents(tmp_path / "out")) - {"datapackage.json"}
    for resource in resources:
        assert set(resource["name"]) <= set("abcdefghijklmnopqrstuvwxyz0123456789-_./")
        assert not resource["path"].startswith("/")
        assert ".." not in resource["path"]
        content = (tmp_path / "out" / resource["path"]).read_bytes()
        assert resource["bytes"] == len(content)
        assert resource["hash"] == f"sha256:{hashlib.sha256(content).hexdigest()}"
        rows = list(csv.reader(content.decode().splitlines(keepends=True)))
        fields = resource["schema"]["fields"]
        assert [field["name"] for field in fields] == [restored(title) for title in rows[0]]
        kinds: dict[str, Callable[[str], Any]] = {
            "string": str, "number": float, "integer": int, "date": dt.date.fromisoformat,
            "boolean": {"yes": True, "no": False}.__getitem__,
        }  # fmt: skip
        for row in rows[1:]:
            for field, cell in zip(fields, row, strict=True):
                if cell or field.get("constraints", {}).get("required"):
                    kinds[field["type"]](cell)


def test_without_places_nothing_tells_where_or_when_exactly(store: Store, tmp_path: Path) -> None:
    export(store, tmp_path / "out", without_places=True)
    everything = b"".join(contents(tmp_path / "out").values())
    today = dt.date.today().isoformat()
    private = ("pump", "1+1", "worn", "left first", "recorded_at", "terminal", today)
    assert [text for text in private if text.encode() in everything] == []
    assert set(contents(tmp_path / "out")) == {
        "vehicles.csv", "entries.csv", "modifications.csv", "events.csv", "weather.csv", "datapackage.json",
    }  # fmt: skip
    again = Store.create(tmp_path / "again.logbook")
    bring_in(again, tmp_path / "out")
    assert [entry.energy for entry in again.entries("van")] == [entry.energy for entry in store.entries("van")]


@pytest.mark.skipif(os.name != "posix", reason="file modes are POSIX")
def test_only_its_owner_may_read_it(store: Store, tmp_path: Path) -> None:
    earlier = os.umask(0)
    try:
        export(store, tmp_path / "out")
    finally:
        os.umask(earlier)
    paths = [tmp_path / "out", *(tmp_path / "out").rglob("*")]
    assert {(path.is_dir(), stat.S_IMODE(path.stat().st_mode)) for path in paths} == {(True, 0o700), (False, 0o600)}


def test_what_is_there_is_kept(store: Store, tmp_path: Path) -> None:
    out = tmp_path / "out"
    export(store, out)
    before = contents(out)
    with pytest.raises(LogbookError, match="not empty"):
        export(store, out)
    store.add_event(Event("van", DAY, "service"))
    export(store, out, force=True)
    assert contents(out) != before
    assert [path.name for path in tmp_path.iterdir() if path.name.startswith(".")] == []
    (out / "letter.txt").write_text("mine")
    with pytest.raises(LogbookError, match=r"more than an export \(letter.txt\)"):
        export(store, out, force=True)
    assert (out / "letter.txt").read_text() == "mine"
    for path in (tmp_path / "my.logbook", tmp_path / "none" / "out"):
        with pytest.raises(LogbookError):
            export(store, path, force=True)


@pytest.mark.skipif(os.name != "posix", reason="links need rights elsewhere")
def test_a_link_is_not_followed(store: Store, tmp_path: Path) -> None:
    (tmp_path / "empty").mkdir()
    (tmp_path / "out").symlink_to(tmp_path / "empty")
    with pytest.raises(LogbookError, match="is a link"):
        export(store, tmp_path / "out", force=True)
    assert list((tmp_path / "empty").iterdir()) == []


def test_a_changed_table_comes_in_without_the_history(store: Store, tmp_path: Path) -> None:
    export(store, tmp_path / "out")
    entries = tmp_path / "out" / "entries.csv"
    entries.write_text(entries.read_text().replace("40.1", "39.9"))
    again = Store.create(tmp_path / "again.logbook")
    outcome = bring_in(again, tmp_path / "out")
    assert any("entries.csv changed since the export" in note for note in outcome.notes)
    assert again.entries("van")[0].energy == 39.9
    assert len(again.query("SELECT 1 FROM change")) == 1


def test_tables_that_disagree_are_refused(store: Store, tmp_path: Path) -> None:
    """A history made to say something else, with digests that fit."""
    out = tmp_path / "out"
    export(store, out)
    path = out / "history" / "entry.csv"
    changed = path.read_text().replace(",40.1,", ",39.9,")
    path.write_text(changed)
    package = json.loads((out / "datapackage.json").read_text())
    for resource in package["resources"]:
        if resource["path"] == "history/entry.csv":
            resource["hash"] = f"sha256:{hashlib.sha256(path.read_bytes()).hexdigest()}"
    (out / "datapackage.json").write_text(json.dumps(package))
    again = Store.create(tmp_path / "again.logbook")
    with pytest.raises(LogbookError, match=r"entries.csv and the history do not agree"):
        bring_in(again, out)
    assert again.vehicles() == []


@pytest.mark.parametrize(
    "text", ["", "{", "[]", "null", '{"logbook_version": "3"}', '{"logbook_version": 3}', "[" * 100_000]
)
def test_a_descriptor_that_says_nothing_is_passed_over(store: Store, tmp_path: Path, text: str) -> None:
    export(store, tmp_path / "out")
    (tmp_path / "out" / "datapackage.json").write_text(text)
    again = Store.create(tmp_path / "again.logbook")
    try:
        bring_in(again, tmp_path / "out")
    except LogbookError:
        assert again.vehicles() == []
    else:
        assert len(again.entries("van")) == 5


def test_a_long_note_comes_back(store: Store, tmp_path: Path) -> None:
    store.add_entry(Entry("van", DAY + dt.timedelta(days=30), 40.0, 9_000.0, note="x" * 300_000), {})
    export(store, tmp_path / "out")
    again = Store.create(tmp_path / "again.logbook")
    bring_in(again, tmp_path / "out")
    assert again.last_entries("van", 1) == store.last_entries("van", 1)
