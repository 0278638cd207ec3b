"""Arguments and files nobody would write: no traceback, and the logbook is as it was wherever one is refused."""

from __future__ import annotations

import shutil
from pathlib import Path
from typing import Any

import pytest
import typer
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from energytrack.cli.app import COMMANDS, app
from tests.faults.commands import new_logbook
from tests.faults.inside import held, inside, is_told, obeyed

FEW = settings(
    max_examples=12, derandomize=True, deadline=None, database=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)  # fmt: skip
MORE = settings(FEW, max_examples=40)
# no system passes a NUL in an argument; a "/" would lead out of the folder of the test
TEXT = st.text(st.characters(blacklist_characters="\0/", blacklist_categories=()), max_size=12)
ODD = ("", "-1", "0", "1", "3", "1e308", "nan", "12000", "2025-01-05", "2025-02-30", "van", "x=1", "=", ":", "../x")
WORD = st.sampled_from(ODD) | TEXT
CELL = st.sampled_from(
    ("", "2025-01-30", "1.2.2025", "40", "-40", "17000", "1e400", "1,5", "yes", "van", "=1+1", '"', 'a"b', "\x1b[31m",
     "20250130", "TAVG", "9999-12-31", "XX000000001", "\0", "x" * 300)
) | st.text(max_size=6)  # fmt: skip
TITLE = st.sampled_from(
    ("vehicle", "date", "odometer_km", "energy", "distance_km", "cost", "kind", "full", "name", "fitted_date",
     "carrier", "fitted_km", "what", "temperature_c", "minimum_c",
     "STATION", "DATE", "TAVG", "TMAX", "ID", "ELEMENT", "note", "")
)  # fmt: skip
MARK, END = st.sampled_from(",;\t"), st.sampled_from(("\n", "\r\n", "\r", '"\n'))
STARTS = ("", "date,odometer_km,energy\n", "vehicle,name,fitted_km\n", "date,temperature_c\n", "date,what\n",
          "XX000000001202501TAVG", "XX000000001,20250101,TAVG,", "STATION,DATE,TAVG\n")  # fmt: skip


@st.composite
def tables(draw: st.DrawFn) -> bytes:
    """Bytes that are, more or less, a table."""
    mark, end = draw(MARK), draw(END)
    header = draw(st.lists(TITLE, max_size=6, unique=True))
    rows = draw(st.lists(st.lists(CELL, min_size=len(header), max_size=len(header) or 4), max_size=5))
    text = draw(st.sampled_from(STARTS)) + end.join(mark.join(row) for row in [header, *rows])
    return text.encode(draw(st.sampled_from(("utf-8", "utf-16", "cp1252"))), "replace") + draw(st.binary(max_size=4))


def parameters(command: str) -> list[tuple[list[str], list[Any]]]:
    """The words that call a command, or each of its own, and what it takes."""
    found = typer.main.get_command(app).get_command(None, command)  # type: ignore[attr-defined]
    own = getattr(found, "commands", None)
    return [([command, name], each.params) for name, each in own.items()] if own else [([command], found.params)]


@st.composite
def lines(draw: st.DrawFn, command: str) -> list[str]:
    """A command with some of its options, and a few words."""
    words, taken = draw(st.sampled_from(parameters(command)))
    typed = draw(st.lists(WORD, max_size=3))
    for each in draw(st.lists(st.sampled_from(taken), max_size=4) if taken else st.just([])):
        if each.param_type_name == "option":
            typed += [draw(st.sampled_from(each.opts)), *([] if each.is_flag else [draw(WORD)])]
    return [*words, *typed]


@pytest.fixture
def copied(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> tuple[Path, Path]:
    """A logbook, and where each example gets a copy of it."""
    inner = tmp_path / "inner"
    inner.mkdir()
    monkeypatch.chdir(inner)
    return new_logbook(tmp_path / "first.logbook"), inner / "my.logbook"


def told(copied: tuple[Path, Path], *words: str) -> None:
    first, path = copied
    for end in ("", "-wal", "-shm"):
        Path(f"{path}{end}").unlink(missing_ok=True)
    shutil.copy(first, path)
    before = held(path)
    ended = inside(path, *words)
    assert is_told(ended), (words, ended)
    assert obeyed(ended.out + ended.err) == set(), (words, ended)
    if ended.status in (1, 2):
        assert held(path) == before, (words, ended)


@pytest.mark.parametrize("command", [name for name in COMMANDS if name != "rehearse"])  # that one runs others
def test_any_arguments(copied: tuple[Path, Path], command: str) -> None:
    @FEW
    @given(lines(command))
    def run(words: list[str]) -> None:
        told(copied, *words)

    run()


@pytest.mark.parametrize(
    "words",
    [("import",), ("import", "--vehicle", "van", "--skip-bad", "bad.csv"), ("import", "--table", "modifications"),
     ("import", "--table", "events"), ("import", "--table", "weather"), ("weather",), ("weather", "--skip-bad")],
    ids=" ".join,
)  # fmt: skip
def test_any_table(copied: tuple[Path, Path], words: tuple[str, ...]) -> None:
    @MORE
    @given(tables(), st.sampled_from(("table.csv", "station.dly")))
    def run(content: bytes, name: str) -> None:
        Path("bad.csv").unlink(missing_ok=True)
        Path(name).write_bytes(content)
        told(copied, *words, name)

    run()


def test_any_folder(copied: tuple[Path, Path]) -> None:
    """An export with one file replaced or changed: brought in, or read as a logbook."""
    export = Path("export")
    assert inside(copied[0], "export", export).status == 0
    files = sorted(each for each in export.rglob("*") if each.is_file())

    @MORE
    @given(st.sampled_from(files), tables(), st.integers(0, 400), st.booleans())
    def run(file: Path, content: bytes, at: int, whole: bool) -> None:
        kept = file.read_bytes()
        file.write_bytes(content if whole else kept[:at] + content[:3] + kept[at + 3 :])
        try:
            told(copied, "import", str(export))
            ended = inside(export, "entries")
            assert is_told(ended), ended
            assert obeyed(ended.out + ended.err) == set()
        finally:
            file.write_bytes(kept)

    run()
