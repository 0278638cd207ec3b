"""Files made to fill the memory, to be unpacked, or to lead elsewhere."""

from __future__ import annotations

import bz2
import gzip
import io
import lzma
import os
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

from energytrack.logbook.csvfile import LINE_LIMIT
from tests.faults.commands import new_logbook
from tests.faults.inside import Ended, held, inside, is_told, obeyed

HEAD = b"date,odometer_km,energy\n"
ROW = HEAD + b"2025-06-01,20000,40\n"
STATION = b"XX000000001202501TAVG"


def zipped(content: bytes) -> bytes:
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("table.csv", content)
    return packed.getvalue()


def refused(ended: Ended, *said: str) -> None:
    assert ended.status == 1, (ended.status, ended.out, ended.err)
    assert len(ended.err.splitlines()) == 1
    assert is_told(ended)
    assert obeyed(ended.err) == set()
    assert len(ended.err) < 3000
    for part in said:
        assert part in ended.err


@pytest.mark.parametrize("pack", [gzip.compress, bz2.compress, lzma.compress, zipped])
@pytest.mark.parametrize("command", ["import", "weather"])
@pytest.mark.parametrize("name", ["table.csv", "station.dly", "table.xlsx", "table.csv.gz"])
def test_nothing_is_unpacked(tmp_path: Path, pack: Callable[[bytes], bytes], command: str, name: str) -> None:
    """Whatever its name says; by the first bytes that the formats' descriptions give."""
    path = new_logbook(tmp_path / "my.logbook")
    before = held(path)
    (tmp_path / name).write_bytes(pack(ROW))
    refused(inside(path, command, tmp_path / name), "is packed", "save it as CSV")
    assert held(path) == before


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (b"," * 3_000_000, "1: a row of more than"),
        (HEAD + b"," * 3_000_000, "2: a row of more than"),
        (HEAD + b"1," * 2000 + b"\n", "2001 columns are too many"),
        (b'"\n",' * 400_000, "a row of more than"),
        (HEAD + b'"a\n",' * 400_000, "a row of more than"),
        (b'"' * 2_000_000, "1: a row of more than"),
        (HEAD + b'"' + b"\n" * 400_000, "never closed"),
        (b"\n" * 2_000_000, "no header in its first"),
        (b"\0" * 1000, "NUL byte"),
        (HEAD + b"2025-06-01,20000,40\0\n", "NUL byte"),
        (HEAD.replace(b"\n", b",note\n") + b"2025-06-01,20000,40," + b"x" * 20_000 + b"\n", "shorten it to 10,000"),
        (HEAD.replace(b"\n", b",note\n") + b"2025-06-01,20000,40," + b"x" * 10_000_000 + b"\n", "a row of more than"),
        (HEAD + b"2025-06-01,20000,1e-320\n", "beyond anything measured"),
        (HEAD + b"2025-06-01,1e308,40\n", "beyond anything measured"),
        (HEAD + b"2025-06-01,20000," + b"9" * 100_000 + b"\n", "beyond anything measured"),
    ],
    ids=range(15),
)
def test_tables_that_would_fill_the_memory_are_refused(tmp_path: Path, content: bytes, said: str) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    before = held(path)
    (tmp_path / "table.csv").write_bytes(content)
    refused(inside(path, "import", tmp_path / "table.csv"), said)
    assert held(path) == before


def test_a_station_file_without_line_ends_is_refused(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    for content in (STATION + b"x" * 2 * LINE_LIMIT, STATION + b"\n" + b"x" * 2 * LINE_LIMIT):
        (tmp_path / "station.dly").write_bytes(content)
        refused(inside(path, "weather", tmp_path / "station.dly"), "a row of more than")


def test_rows_of_many_short_lines_are_read(tmp_path: Path) -> None:
    """What bounds a row starts anew with each: a long table is not a long row."""
    path = new_logbook(tmp_path / "my.logbook")
    rows = (f'2025-03-{day:02d},{20_000 + 500 * day},40,"{"x" * 9_000}\n{"y" * 900}"\n' for day in range(1, 31))
    (tmp_path / "table.csv").write_text("date,odometer_km,energy,note\n" + "".join(rows) * 5, encoding="utf-8")
    assert (tmp_path / "table.csv").stat().st_size > LINE_LIMIT
    ended = inside(path, "import", tmp_path / "table.csv", "--again")
    assert ended.status == 0, ended.err


def test_rejected_rows_hold_no_formula_and_come_in_again(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    table, bad = tmp_path / "table.csv", tmp_path / "bad.csv"
    table.write_bytes(HEAD.replace(b"\n", b",note\n") + b"2025-06-01,20000,-40,=1+1\n2025-06-03,20500,40,@sum\n")
    assert inside(path, "import", table, "--skip-bad", bad).status == 0
    header, row = bad.read_text(encoding="utf-8").splitlines()
    assert row.startswith("2025-06-01,20000,-40,'=1+1,")
    bad.write_text(f"{header}\n{row.replace('-40', '40', 1)}\n", encoding="utf-8")
    assert inside(path, "import", bad).status == 0
    assert "'=1+1'" in held(path)
    assert "''=1+1" not in held(path), "the mark of a spreadsheet is gone"


@pytest.mark.skipif(os.name != "posix", reason="links need rights elsewhere")
@pytest.mark.parametrize("force", [(), ("--force",)])
@pytest.mark.parametrize(
    "words",
    [
        ("report", "link.html"), ("report", "link.md"), ("report", "new.html", "--figures", "link"),
        ("regimes", "--figure", "link.svg"), ("regimes", "--figure", "link.png"), ("backup", "link.logbook"),
        ("export", "link"),
    ],
    ids=" ".join,
)  # fmt: skip
def test_a_link_at_the_place_of_an_output_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, words: tuple[str, ...], force: tuple[str, ...]
) -> None:
    """One to a file, one to nothing and one to a folder alike: what it leads to stays as it is."""
    monkeypatch.chdir(tmp_path)
    path = new_logbook(tmp_path / "my.logbook")
    name = next(word for word in words if word.startswith("link"))
    precious, folder = tmp_path / "precious", tmp_path / "folder"
    precious.write_text("kept")
    folder.mkdir()
    for target in (precious, tmp_path / "nothing", folder):
        Path(name).symlink_to(target)
        refused(inside(path, *words, *force), "is a link")
        assert Path(name).is_symlink()
        Path(name).unlink()
    assert precious.read_text() == "kept"
    assert not (tmp_path / "nothing").exists()
    assert list(folder.iterdir()) == []


@pytest.mark.parametrize("name", ["../../nowhere/x", "a/b/x", "a/../x", "x" * 300])
def test_a_place_that_is_not_there_is_not_made(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    inner = tmp_path / "inner"
    inner.mkdir()
    monkeypatch.chdir(inner)
    for words in (
        ("report", f"{name}.html"), ("report", "new.html", "--figures", name), ("export", name), ("backup", name),
        ("regimes", "--figure", f"{name}.svg"),
    ):  # fmt: skip
        refused(inside(path, *words))
    assert list(inner.iterdir()) == []
    assert {each.name for each in tmp_path.iterdir()} == {"my.logbook", "inner"}
