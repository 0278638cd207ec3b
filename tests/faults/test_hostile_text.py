"""Whatever a text means to a terminal, a page, a database or a spreadsheet: it is shown inert, or refused in a line."""

from __future__ import annotations

import csv
import re
from pathlib import Path

import pytest

from energytrack.logbook.checks import LONGEST_TEXT
from energytrack.logbook.store import Store
from tests.faults.commands import new_logbook
from tests.faults.hostile import MISCHIEF, hostile_logbook
from tests.faults.inside import Ended, held, inside, is_told, obeyed

SHOWING = (
    "vehicle list", "mod list", "entries", "entries --json", "history", "history --json", "check", "enough",
    "enough --json", "plan", "regimes", "regimes --figure f.svg", "regimes --figure f.png", "review", "review --json",
    "review --fleet", "report r.html", "report r.md", "export out", "backup b.logbook", "amend 12000 --amount 41",
    "strike 12500", "undo", "fillup 41000 40 --date 2025-01-01", "confirm 13000",
)  # fmt: skip
LONG = "x" * 10_000_000


def inert(ended: Ended) -> None:
    assert obeyed(ended.out + ended.err) == set()
    assert is_told(ended), (ended.status, ended.err)


@pytest.fixture(scope="module")
def shown(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, dict[str, Ended]]:
    """What every command says of the hostile logbook, and the folder it wrote to."""
    folder = tmp_path_factory.mktemp("hostile")
    path = hostile_logbook(folder / "my.logbook")
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        return folder, {line: inside(path, *line.split()) for line in SHOWING}


@pytest.mark.parametrize("line", SHOWING)
def test_what_a_command_shows_is_inert(shown: tuple[Path, dict[str, Ended]], line: str) -> None:
    ended = shown[1][line]
    inert(ended)
    assert ended.status == 0, ended.err


def test_what_a_command_writes_is_inert(shown: tuple[Path, dict[str, Ended]]) -> None:
    """A page holds no element or link of a user's making; a table no cell that a spreadsheet runs."""
    folder = shown[0]
    for name in ("r.html", "r.md", "f.svg"):
        assert obeyed((folder / name).read_text(encoding="utf-8")) == set()
        assert not re.search(r"(?<!\\)<script", (folder / name).read_text(encoding="utf-8"))
    assert not re.search(r"(?<!\\)\]\(javascript", (folder / "r.md").read_text(encoding="utf-8"))
    cells = [
        cell
        for table in (folder / "out").rglob("*.csv")
        for row in csv.reader(table.open(encoding="utf-8", newline=""))
        for cell in row
    ]
    assert any(cell.startswith("'=1+1") for cell in cells)
    assert [cell for cell in cells if cell.startswith(("=", "@", "+", "\t", "\r"))] == []


def test_nothing_of_it_is_run_or_lost(shown: tuple[Path, dict[str, Ended]]) -> None:
    """Out and in again, the texts are the same, and the tables are there."""
    folder = shown[0]
    ended = inside(folder / "my.logbook", "export", folder / "now")
    assert ended.status == 0, ended.err
    again = folder / "again.logbook"
    Store.create(again).close()
    assert inside(again, "import", folder / "now").status == 0
    store = Store(again)
    (vehicle,) = store.vehicles()
    assert vehicle.name == f"van {MISCHIEF}"
    assert {entry.note for entry in store.entries(vehicle.name)} == {MISCHIEF, ""}
    store.close()


@pytest.mark.parametrize(
    "words",
    [
        (MISCHIEF,), ("--" + MISCHIEF,), ("entries", "--" + MISCHIEF), ("entries", "--vehicle", MISCHIEF),
        ("entries", "--last", MISCHIEF), ("mod", "fitted", MISCHIEF, 14_000), ("vehicle", "add", MISCHIEF),
        ("vehicle", "add", "car", "--carrier", MISCHIEF), ("fillup", MISCHIEF, 40), ("fillup", 20_000, MISCHIEF),
        ("fillup", 20_000, 40, "--set", MISCHIEF), ("review", "--part-cost", MISCHIEF + "=1"), ("amend", MISCHIEF),
        ("amend", 10_500, "--clear", MISCHIEF), ("review", "--month", MISCHIEF), ("enough", MISCHIEF),
    ],
)  # fmt: skip
def test_a_wrong_argument_is_repeated_inert(tmp_path: Path, words: tuple[object, ...]) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    before = held(path)
    ended = inside(path, *words)
    inert(ended)
    assert ended.status in (1, 2)
    assert held(path) == before


@pytest.mark.parametrize(
    "words",
    [
        ("fillup", 16_000, 40, "--note", LONG), ("fillup", 16_000, 40, "--place", LONG), ("fillup", 16_000, LONG),
        ("fillup", 16_000, 40, "--date", LONG), ("fillup", 16_000, 40, "--currency", LONG), ("event", LONG),
        ("event", "tyres", "--note", LONG), ("mod", "fitted", LONG, 14_000), ("amend", 10_500, "--note", LONG),
        ("mod", "fitted", "skirts", 14_000, "--note", LONG), ("strike", 10_500, "--why", LONG), ("import", LONG),
        ("amend", 10_500, "--amount", 41, "--why", LONG), ("undo", "--why", LONG), ("entries", "--vehicle", LONG),
        ("vehicle", "add", LONG, "--carrier", "diesel"), ("vehicle", "add", "c", "--carrier", "diesel", "--note", LONG),
    ],
    ids=lambda words: " ".join(str(word)[:9] for word in words),
)  # fmt: skip
def test_ten_megabytes_are_refused_in_a_short_line(tmp_path: Path, words: tuple[object, ...]) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    before = held(path)
    ended = inside(path, *words)
    assert ended.status == 1
    assert is_told(ended)
    assert len(ended.err.splitlines()) == 1
    assert len(ended.err) < 3000
    assert held(path) == before


def test_a_note_of_some_pages_is_kept(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    note = "x" * LONGEST_TEXT
    assert inside(path, "fillup", 16_000, 40, "--date", "2025-01-20", "--note", note).status == 0
    assert note in inside(path, "entries").out.replace("\n", "").replace(" ", "")


@pytest.mark.parametrize("number", ["1e308", "-1e308", "1e400", "1e-320", "5e-324", "1e-200", "nan", "inf", "1e16"])
@pytest.mark.parametrize(
    "words",
    [
        ("fillup", "N", 40), ("fillup", 16_000, "N"), ("fillup", 16_000, 40, "--cost", "N"),
        ("fillup", 16_000, 40, "--speed", "N"), ("fillup", 16_000, 40, "--set", "payload=N"),
        ("fillup", 40, "--distance", "N"), ("vehicle", "add", "c", "--carrier", "diesel", "--capacity", "N"),
        ("vehicle", "add", "c", "--carrier", "diesel", "--co2", "N"), ("mod", "fitted", "skirts", "N"),
        ("mod", "fitted", "skirts", 14_000, "--target", "N"), ("mod", "fitted", "skirts", 14_000, "--level", "N"),
        ("event", "tyres", 14_000, "--odometer-factor", "N"), ("amend", 10_500, "--amount", "N"),
        ("plan", "--target", "N"), ("plan", "--confidence", "N"), ("plan", "--power", "N"),
        ("enough", "--confidence", "N"), ("review", "--grid-factor", "N"), ("review", "--co2", "diesel=N"),
    ],
    ids=lambda words: " ".join(str(word)[:9] for word in words),
)  # fmt: skip
def test_numbers_beyond_all_measure_are_refused(tmp_path: Path, words: tuple[object, ...], number: str) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    before = held(path)
    typed = [str(word).replace("N", number) if "N" in str(word) else word for word in words]
    ended = inside(path, *typed)
    assert ended.status == 1, (ended.status, ended.err, ended.out)
    assert len(ended.err.splitlines()) == 1
    assert is_told(ended)
    assert held(path) == before


@pytest.mark.parametrize("day", ["9999-12-31", "3000-01-01"])
def test_a_plan_for_the_end_of_the_calendar_is_refused(tmp_path: Path, day: str) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    for words in (("plan", "--date", day), ("plan", "--trip-noise", 2, "--date", day)):
        ended = inside(path, *words)
        assert ended.status == 1
        assert is_told(ended)
