"""`regimes` as a process: text in a pipe and on a terminal, JSON, figures, bad input."""

from __future__ import annotations

import csv
import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

from energytrack.cli.questions import tables
from energytrack.inference.regimes.find import find_regimes
from energytrack.logbook.opening import open_logbook
from tests.documents import ROOT

DEMO = ROOT / "demo_logbook"


def run(
    *words: str, folder: Path, logbook: Path | str = DEMO, path: str = str(ROOT), **variables: str
) -> subprocess.CompletedProcess[str]:
    environment = {name: value for name, value in os.environ.items() if not name.startswith("ENERGYTRACK_")}
    return subprocess.run(
        [sys.executable, "-m", "energytrack", "--logbook", str(logbook), "regimes", *words],
        cwd=folder, env={**environment, "COLUMNS": "80", "PYTHONPATH": path, **variables},
        capture_output=True, text=True, encoding="utf-8", check=False,
    )  # fmt: skip


def folder_of(folder: Path, entries: list[dict[str, str]]) -> Path:
    """A logbook of one van with these entries."""
    logbook = folder / "log"
    logbook.mkdir()
    (logbook / "vehicles.csv").write_text("vehicle,carrier,unit,capacity\nvan,diesel,L,75\n", encoding="utf-8")
    with (logbook / "entries.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, fieldnames=list(entries[0]))
        writer.writeheader()
        writer.writerows(entries)
    return logbook


def demo_entries(vehicle: str) -> list[dict[str, str]]:
    with (DEMO / "entries.csv").open(encoding="utf-8", newline="") as file:
        return [row for row in csv.DictReader(file) if row["vehicle"] == vehicle]


def test_a_fitted_part_is_found_without_being_told_of_it(tmp_path: Path) -> None:
    done = run("--vehicle", "van", folder=tmp_path)
    assert (done.returncode, done.stderr) == (0, "")
    text = done.stdout
    assert " ".join(text.split()).startswith("Consumption shifted once: -5.4 % at about 94,600 km (agrees with roof")
    assert "\x1b" not in text, "no colour in a pipe"
    assert max(map(len, text.splitlines())) <= 80
    assert re.search(r"^ *A +B$", text, flags=re.MULTILINE)
    assert list(tmp_path.iterdir()) == []


def test_the_same_change_is_unexplained_where_nothing_was_logged(tmp_path: Path) -> None:
    logbook = folder_of(tmp_path, demo_entries("van"))
    text = " ".join(run(folder=tmp_path, logbook=logbook).stdout.split())
    assert "(nothing logged there)" in text
    assert 'energytrack event "WHAT HAPPENED"' in text
    assert "Places to look: tyres" in text


def test_json_holds_a_report_for_every_vehicle(tmp_path: Path) -> None:
    found = json.loads(run("--json", folder=tmp_path).stdout)
    assert list(found) == ["reports"]
    assert [report["vehicle"] for report in found["reports"]] == ["van", "car", "electric"]
    logbook = open_logbook(DEMO)
    for report, vehicle in zip(found["reports"], logbook.vehicles(), strict=True):
        expected = json.loads(json.dumps(find_regimes(**tables(logbook, vehicle)).to_dict()))
        assert report == {**expected, "vehicle": vehicle.name}
    assert len(found["reports"][0]["breaks"]) == 1


def test_options_reach_the_search(tmp_path: Path) -> None:
    words = ("--vehicle", "van", "--max-breaks", "2", "--confidence", "0.9", "--slopes", "--json")
    (report,) = json.loads(run(*words, folder=tmp_path).stdout)["reports"]
    logbook = open_logbook(DEMO)
    options = {"max_breaks": 2, "confidence": 0.9, "slopes": True}
    expected = find_regimes(**tables(logbook, logbook.vehicle("van")), **options).to_dict()  # type: ignore[arg-type]
    assert report["statistic"] == pytest.approx(expected["statistic"])
    assert report["confidence"] == 0.9
    assert len(report["criteria"]) == 3


@pytest.mark.skipif(sys.platform == "win32", reason="pexpect needs a POSIX terminal")
@pytest.mark.parametrize(("variable", "value"), [("NO_COLOR", "1"), ("TERM", "dumb")])
def test_a_terminal_without_colour_shows_the_same_words(tmp_path: Path, variable: str, value: str) -> None:
    import pexpect

    child = pexpect.spawn(
        sys.executable, ["-m", "energytrack", "--logbook", str(DEMO), "regimes", "--vehicle", "van"],
        env={**os.environ, "PYTHONPATH": str(ROOT), variable: value}, dimensions=(50, 80), encoding="utf-8",
        cwd=str(tmp_path), timeout=60,
    )  # fmt: skip
    child.expect(pexpect.EOF)
    text = child.before or ""
    assert re.search(r"\x1b\[[0-9;]*3[0-7]m", text) is None
    shown = re.sub(r"\x1b\[[0-9;?]*[A-Za-z]", "", text).replace("\r", "")
    assert shown.endswith(run("--vehicle", "van", folder=tmp_path).stdout), "after the progress bar, wiped away"


@pytest.mark.parametrize("ending", ["svg", "png"])
def test_a_figure_beside_the_answer(tmp_path: Path, ending: str) -> None:
    name = f"van.{ending}"
    done = run("--vehicle", "van", "--figure", name, folder=tmp_path)
    assert done.returncode == 0
    assert done.stdout.endswith(f"drawn to {name}\n")
    data = (tmp_path / name).read_bytes()
    assert data.startswith(b"\x89PNG" if ending == "png" else b"<?xml")
    again = run("--vehicle", "van", "--figure", name, folder=tmp_path)
    assert (again.returncode, again.stdout) == (1, "")
    assert again.stderr == f"energytrack: {name} is there already: name another file, or replace it with --force\n"
    assert run("--vehicle", "van", "--figure", name, "--force", "--json", folder=tmp_path).returncode == 0
    assert (tmp_path / name).read_bytes() == data, "and the same bytes again"


def test_without_the_extra_only_figures_are_missing(tmp_path: Path) -> None:
    (tmp_path / "matplotlib.py").write_text("raise ImportError('not installed')\n", encoding="utf-8")
    path = os.pathsep.join([str(tmp_path), str(ROOT)])
    assert run("--vehicle", "car", folder=tmp_path, path=path).returncode == 0
    done = run("--vehicle", "car", "--figure", "car.svg", folder=tmp_path, path=path)
    assert (done.returncode, done.stdout) == (1, "")
    assert re.fullmatch(r"energytrack: .*the report extra.*pip install 'energytrack\[report\]'\n", done.stderr)


@pytest.mark.parametrize(
    ("words", "status", "said"),
    [
        (("--vehicle", "lorry"), 1, "no vehicle 'lorry' in .*; it has van, car, electric"),
        (("--vehicle", "car", "--confidence", "2"), 1, "confidence must lie between 0.5 and 1"),
        (("--vehicle", "car", "--max-breaks", "0"), 1, "ask for 1 to 10"),
        (("--vehicle", "car", "--max-breaks", "many"), 2, "many"),
        (("--figure", "all.svg"), 2, "name it with --vehicle"),
        (("--vehicle", "car", "--figure", "car.pdf"), 1, r"ends in \.svg or \.png"),
        (("--vehicle", "car", "--figure", "missing/car.svg"), 1, "missing is no folder"),
    ],
)
def test_what_cannot_be_asked_is_refused(tmp_path: Path, words: tuple[str, ...], status: int, said: str) -> None:
    done = run(*words, folder=tmp_path)
    assert (done.returncode, done.stdout) == (status, "")
    assert re.search(said, done.stderr)
    assert "Traceback" not in done.stderr
    assert status == 2 or len(done.stderr.splitlines()) == 1


def test_a_file_that_cannot_be_written_is_one_line(tmp_path: Path) -> None:
    done = run("--vehicle", "car", "--figure", f"{'c' * 300}.svg", folder=tmp_path)
    assert done.returncode == 1
    assert len(done.stderr.splitlines()) == 1
    assert "Traceback" not in done.stderr


@pytest.mark.parametrize("which", ["few", "void", "constant"])
def test_a_log_that_cannot_answer_says_what_is_missing(tmp_path: Path, which: str) -> None:
    entries = demo_entries("van")[:40]
    if which == "few":
        entries = entries[:8]
    elif which == "void":
        entries = [{**row, "full": "no", "level_percent": ""} for row in entries]
    else:
        entries = [
            {"vehicle": "van", "date": row["date"], "odometer_km": str(1000 + 500 * k), "energy": "40"}
            for k, row in enumerate(entries)
        ]
    done = run(folder=tmp_path, logbook=folder_of(tmp_path, entries))
    assert (done.returncode, done.stderr) == (0, "")
    said = {"few": r"12 are needed, \d more fill-ups .* about [\d,]+ km", "void": "12 segments", "constant": "the same"}
    assert re.search(f"^No answer yet: .*{said[which]}", " ".join(done.stdout.split()))
    (report,) = json.loads(run("--json", folder=tmp_path, logbook=tmp_path / "log").stdout)["reports"]
    assert report["note"]
    assert report["breaks"] == []


def test_no_figure_where_there_is_nothing_to_draw(tmp_path: Path) -> None:
    logbook = folder_of(tmp_path, demo_entries("van")[:8])
    done = run("--figure", "van.svg", folder=tmp_path, logbook=logbook)
    assert done.returncode == 1
    assert done.stdout.startswith("No answer yet")
    assert done.stderr.startswith("energytrack: nothing to draw for van: ")
    assert not (tmp_path / "van.svg").exists()
