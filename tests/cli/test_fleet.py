"""A fleet's month and control vehicles, as typed; real processes."""

from __future__ import annotations

import json
import re
import subprocess
import sys

import pytest

from energytrack.logbook.opening import open_logbook
from energytrack.presentation.columns import cells_wide
from tests.documents import ROOT
from tests.fleets import fleet, write

DEMO = str(ROOT / "demo_logbook")
REVIEW = (
    "import sys\n"
    "from energytrack.cli.fleet import fleet\n"
    "from energytrack.logbook.opening import open_logbook\n"
    "if __name__ == '__main__':\n"
    "    book = open_logbook(sys.argv[1])\n"
    "    fleet(book, book.vehicles(), month=sys.argv[2], as_json=len(sys.argv) > 3)\n"
)


def python(*arguments: str) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, *arguments]
    return subprocess.run(command, cwd=ROOT, capture_output=True, text=True, encoding="utf-8", check=False)


@pytest.fixture(scope="module")
def logbook(tmp_path_factory) -> str:
    """Enough vehicles for worker processes; one has a long name."""
    path = tmp_path_factory.mktemp("fleet") / "fleet.logbook"
    logs = fleet(25, entries=24, seed=3)
    write(open_logbook(path, create=True), logs)
    return str(path)


@pytest.fixture(scope="module")
def script(tmp_path_factory) -> str:
    path = tmp_path_factory.mktemp("script") / "fleet_month.py"
    path.write_text(f"import sys\nsys.path.insert(0, {str(ROOT)!r})\n{REVIEW}", encoding="utf-8")
    return str(path)


def test_a_month_of_a_fleet_fits_eighty_columns_in_plain_characters(script: str, logbook: str) -> None:
    done = python(script, logbook, "2024-02")
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""  # no progress bar in a pipe
    assert done.stdout.isascii()
    assert max(map(cells_wide, done.stdout.splitlines())) <= 80
    assert "25 vehicles" in done.stdout.splitlines()[0]
    assert "part, pooled over" in done.stdout
    assert sum("steady-commute" in line for line in done.stdout.splitlines()) >= 4


def test_json_is_the_same_answer(script: str, logbook: str) -> None:
    done = python(script, logbook, "2024-02", "json")
    found = json.loads(done.stdout)
    assert len(found["vehicles"]) == 25
    assert found["month"] == "2024-02"
    assert found["pooled"][0]["modification"] == "part"
    assert all(each["deviation"] is None or "z" in each["deviation"] for each in found["vehicles"])


def test_a_month_reads_the_same_in_a_fleet_and_alone() -> None:
    asked = ("-m", "energytrack", "--logbook", DEMO, "review", "--month", "2026-10")
    together = python(*asked, "--fleet").stdout
    for vehicle in ("van", "car", "electric"):
        alone = re.match(rf"{vehicle} in 2026-10: ([\d,]+) km at ([\d.]+)", python(*asked, "--vehicle", vehicle).stdout)
        row = re.search(rf"^  {vehicle} +([\d,]+) km +([\d.]+) ", together, re.MULTILINE)
        assert alone is not None
        assert row is not None
        assert row.groups() == alone.groups()


def enough(*words: str) -> subprocess.CompletedProcess[str]:
    return python("-m", "energytrack", "--logbook", DEMO, "enough", *words)


def test_a_vehicle_beside_its_controls() -> None:
    done = enough("--vehicle", "car", "--control", "electric")
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith("Not yet: about ")
    assert "beside controls" in done.stdout
    assert "drift in common" in done.stdout
    shown = json.loads(enough("--vehicle", "car", "--control", "electric", "--json").stdout)["controlled"][0]
    assert shown["controls"] == ["electric"]
    assert shown["verdict"] == "not-yet"


@pytest.mark.parametrize(
    ("words", "status", "said"),
    [
        (["--vehicle", "car", "--control", "nobody"], 1, "no vehicle 'nobody'"),
        (["--vehicle", "car", "--control", "car"], 1, "cannot be its own control"),
        (["--control", "electric"], 2, "name it with --vehicle"),
        (["--vehicle", "car", "--control", "electric", "--compare"], 2, "--control takes no option but"),
        (["wing", "--vehicle", "car", "--control", "electric"], 1, "no modification named 'wing'"),
    ],
)
def test_refusals(words: list[str], status: int, said: str) -> None:
    done = enough(*words)
    assert done.returncode == status
    assert said in " ".join(done.stderr.split())
    assert "Traceback" not in done.stderr
