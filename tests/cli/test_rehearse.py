"""`rehearse` as a process and on a real terminal."""

from __future__ import annotations

import datetime as dt
import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Vehicle
from energytrack.logbook.store import Store
from tests.cli.test_enough import drive, run

FITTED_KM = 4_750.0
CHILDREN = Path(f"/proc/{os.getpid()}/task/{os.getpid()}/children")


@pytest.fixture(scope="module")
def logbook(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A van with side skirts, a car with nothing fitted, and a new car with too little of a log."""
    path = tmp_path_factory.mktemp("log") / "my.logbook"
    book = open_logbook(path, create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    book.add_vehicle(Vehicle("car", "petrol", "L", 50.0, distance_unit="mi"))
    book.add_vehicle(Vehicle("new", "petrol", "L", 50.0))
    drive(book, "van", 16, 0.0, 0.3, seed=1)
    drive(book, "car", 22, 0.0, 0.8, seed=2)
    drive(book, "new", 5, 0.0, 0.8, seed=3)
    book.fit("van", "side skirts", dt.date(2025, 4, 8), FITTED_KM, 5.0)
    book.close()
    return path


def test_json_is_the_same_for_a_seed_and_has_what_was_asked(logbook: Path):
    asked = ("rehearse", "side skirts", "--vehicle", "van", "--runs", "3", "--seed", "7", "--json")
    first, second = run(logbook, *asked), run(logbook, *asked)
    assert first.returncode == 0
    assert first.stderr == ""  # no progress in a pipe
    assert first.stdout == second.stdout
    found = json.loads(first.stdout)
    assert list(found) == ["rehearsals"]
    (rehearsal,) = found["rehearsals"]
    assert (rehearsal["vehicle"], rehearsal["modification"], rehearsal["pretended"]) == ("van", "side skirts", False)
    assert (rehearsal["runs"], rehearsal["seed"], rehearsal["target_percent"]) == (3, 7, 5.0)
    assert rehearsal["no_shift"]["called_shifted"]["of"] == 3
    assert rehearsal["target_shift"]["shift_percent"] == -5.0


def test_every_vehicle_is_answered_and_refusals_named(logbook: Path):
    done = run(logbook, "rehearse", "-n", "2", "--target", "10")
    assert done.returncode == 1
    assert done.stderr.startswith("energytrack: new: too short to rehearse")
    assert done.stderr.count("\n") == 1
    assert "van: side skirts" in done.stdout
    assert "pretended from the middle of your log on" in done.stdout
    assert done.stdout.count("On 2 logs like yours without any shift") == 2
    assert done.stdout.count("segments before and after") == 1  # only the car has a stretch for it
    assert max(map(len, done.stdout.splitlines())) <= 80


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("wing",), "no modification named 'wing'; logged: side skirts"),
        (("--vehicle", "van", "--runs", "0"), "number of runs must lie between 1 and"),
        (("--vehicle", "van", "--target", "-1"), "target"),
        (("--vehicle", "bus"), "bus"),
        (("--vehicle", "new"), "too short to rehearse"),
    ],
)
def test_refusals_are_one_line(logbook: Path, words: tuple[str, ...], said: str):
    done = run(logbook, "rehearse", *words)
    assert done.returncode == 1
    assert said in done.stderr
    assert done.stderr.count("\n") == 1
    assert done.stdout == ""


def listening() -> None:
    """A suite run in the background of a shell passes on that Ctrl-C is ignored: a command in front hears it."""
    signal.signal(signal.SIGINT, signal.SIG_DFL)


@pytest.mark.skipif(sys.platform == "win32", reason="POSIX terminals")
def test_progress_on_a_terminal_and_a_clean_end_on_ctrl_c(logbook: Path):
    pexpect = pytest.importorskip("pexpect")
    words = ["-m", "energytrack", "--logbook", str(logbook), "rehearse", "--vehicle", "van", "--runs", "5000"]
    child = pexpect.spawn(sys.executable, words, encoding="utf-8", timeout=120, cwd=Path(__file__).parents[2],
                          env={**os.environ, "TERM": "xterm"}, preexec_fn=listening)  # fmt: skip
    child.expect(r"van, side skirts.*[1-9]\d*/50\d\d")
    child.sendintr()
    child.expect(pexpect.EOF)
    child.close()
    assert child.exitstatus == 128 + signal.SIGINT
    assert "Traceback" not in child.before


def ended_by_interrupts(child: subprocess.Popen[str]) -> tuple[str, str]:
    """Press Ctrl-C, and again every two seconds: one that falls into the moment of a worker's start is not heard."""
    for _ in range(30):
        os.killpg(child.pid, signal.SIGINT)
        try:
            return child.communicate(timeout=2)
        except subprocess.TimeoutExpired:
            continue
    os.killpg(child.pid, signal.SIGKILL)
    return child.communicate()


@pytest.mark.skipif(not CHILDREN.exists(), reason="needs to see when the workers start")
def test_ctrl_c_while_workers_start_is_clean_too(logbook: Path):
    words = [sys.executable, "-m", "energytrack", "--logbook", str(logbook), "rehearse", "--vehicle", "van"]
    child = subprocess.Popen([*words, "--runs", "5000"], cwd=Path(__file__).parents[2], text=True,
                             stdout=subprocess.PIPE, stderr=subprocess.PIPE, start_new_session=True,
                             preexec_fn=listening)  # fmt: skip
    started = Path(f"/proc/{child.pid}/task/{child.pid}/children")
    while len(started.read_text(encoding="ascii").split()) < 2:  # the first child only keeps count of the others
        assert child.poll() is None
        time.sleep(0.01)
    said, complained = ended_by_interrupts(child)
    assert child.returncode == 128 + signal.SIGINT
    assert (said, complained) == ("", "")
