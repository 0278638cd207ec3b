"""`report` as a process: files written whole, over nothing, for their owner alone; refusals in one line."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.test_enough import ROOT, run
from tests.report import logs

ASKED = ("report", "--date", "2026-01-10")


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("book") / "van.logbook"
    logs.make(path).close()
    return path


def refused(done: subprocess.CompletedProcess[str]) -> str:
    assert done.returncode == 1
    assert done.stdout == ""
    (line,) = done.stderr.splitlines()
    assert line.startswith("energytrack: ")
    return line


def test_one_file_for_its_owner_alone(book: Path, tmp_path: Path) -> None:
    target = tmp_path / "my report.html"
    done = run(book, *ASKED, str(target), "--vehicle", logs.OTHER)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == f"report written to {target}\n"
    assert os.listdir(tmp_path) == [target.name], "nothing is left beside it"
    if sys.platform != "win32":
        assert target.stat().st_mode & 0o777 == 0o600
    text = target.read_text(encoding="utf-8")
    assert text.startswith("<!DOCTYPE html>")
    assert logs.OTHER in text
    assert logs.WHAT not in text, "another vehicle's"

    assert "--force" in refused(run(book, *ASKED, str(target), "--vehicle", logs.OTHER))
    target.write_text("mine", encoding="utf-8")
    done = run(book, *ASKED, str(target), "--vehicle", logs.OTHER, "--force")
    assert done.returncode == 0
    assert target.read_text(encoding="utf-8") == text, "the same bytes again"


def test_markdown_with_its_figures_in_a_folder(book: Path, tmp_path: Path) -> None:
    target = tmp_path / "month.md"
    done = run(book, *ASKED, str(target), "--vehicle", logs.OTHER, "--json")
    assert (done.returncode, done.stderr) == (0, "")
    said = json.loads(done.stdout)
    assert said["report"] == str(target)
    assert said["bytes"] == target.stat().st_size
    assert {Path(each).parent for each in said["figures"]} == {tmp_path / "month-figures"}
    text = target.read_text(encoding="utf-8")
    for each in said["figures"]:
        assert Path(each).is_file()
        assert f"](month-figures/{Path(each).name})" in text
    if sys.platform != "win32":
        assert (tmp_path / "month-figures").stat().st_mode & 0o777 == 0o700
        assert {Path(each).stat().st_mode & 0o777 for each in said["figures"]} == {0o600}


def test_an_earlier_month_is_told_by_what_was_known_then(book: Path, tmp_path: Path) -> None:
    target = tmp_path / "march.html"
    done = run(book, *ASKED, str(target), "--month", "2025-03", "--vehicle", logs.VAN, "--figures", str(tmp_path / "f"))
    assert (done.returncode, done.stderr) == (0, "")
    text = target.read_text(encoding="utf-8")
    assert "onerror=alert(2)" not in text, "it was fitted later"
    assert "alert(3)" in text
    assert len(os.listdir(tmp_path / "f")) == 4


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["x.txt"], "name a file that ends in .html or .htm"),
        (["x.logbook", "--force"], "name a file that ends in .html or .htm"),
        (["x.html", "--format", "md"], "name a file that ends in .md or .markdown"),
        (["nowhere/x.html"], "nowhere is no folder"),
        (["folder.html"], "it is a folder"),
        (["x.html", "--month", "2025-13"], "write it as YYYY-MM"),
        (["x.html", "--month", "2031-01"], "has not begun"),
        (["x.html", "--month", "2024-01"], "has no entry in 2024-01"),
        (["x.html", "--vehicle", "lorry"], "lorry"),
        (["x.html", "--figures", "file"], "it is no folder"),
    ],
)
def test_refusals_are_one_line_and_write_nothing(book: Path, tmp_path: Path, words: list[str], said: str) -> None:
    (tmp_path / "folder.html").mkdir()
    (tmp_path / "file").write_text("")
    place = {"x.", "no", "fo", "fi"}
    typed = [str(tmp_path / word) if word[:2] in place else word for word in words]
    named = [] if "--vehicle" in typed else ["--vehicle", logs.OTHER]
    assert said in refused(run(book, *ASKED, *typed, *named))
    assert sorted(os.listdir(tmp_path)) == ["file", "folder.html"]


@pytest.mark.skipif(sys.platform == "win32" or os.geteuid() == 0, reason="permissions do not bind here")
def test_a_folder_that_cannot_be_written_to(book: Path, tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    try:
        assert "cannot write" in refused(run(book, *ASKED, str(tmp_path / "x.html")))
    finally:
        tmp_path.chmod(0o700)


@pytest.mark.parametrize("missing", ["jinja2", "matplotlib"])
def test_without_the_extra_the_refusal_names_it(book: Path, tmp_path: Path, missing: str) -> None:
    start = f"import sys; sys.modules[{missing!r}] = None; from energytrack.cli.app import main; main()"
    words = ["--logbook", str(book), *ASKED, str(tmp_path / "x.html")]
    done = subprocess.run(
        [sys.executable, "-c", start, *words], cwd=ROOT, capture_output=True, text=True, encoding="utf-8", check=False
    )
    assert "pip install 'energytrack[report]'" in refused(done)
    assert os.listdir(tmp_path) == []


def test_a_wrong_format_is_a_wrong_use(book: Path) -> None:
    done = run(book, *ASKED, "--format", "pdf")
    assert done.returncode == 2
    assert "not one of: html, md" in done.stderr
