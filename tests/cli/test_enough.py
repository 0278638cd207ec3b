"""`enough` and `plan` as processes on real logbook files."""

from __future__ import annotations

import datetime as dt
import json
import math
import os
import random
import sqlite3
import subprocess
import sys
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store
from tests.fitted import fit_parts
from tests.inference.test_several import VARIANTS, plain_log

ROOT = Path(__file__).parents[2]
FITTED_KM = 12_000.0
STEP_KM = 500.0


def run(logbook: Path | None, *words: str, encoding: str = "utf-8") -> subprocess.CompletedProcess[str]:
    named = [] if logbook is None else ["--logbook", str(logbook)]
    environment = {key: value for key, value in os.environ.items() if key != "ENERGYTRACK_LOGBOOK"}
    return subprocess.run(
        [sys.executable, "-m", "energytrack", *named, *words],
        cwd=ROOT,
        env=environment | {"PYTHONIOENCODING": encoding},
        capture_output=True,
        text=True,
        encoding=encoding,
        timeout=300,
    )


def drive(
    book: Store, vehicle: str, tanks: int, shift: float, sloppy: float, seed: int, extra: tuple[str, ...] = ()
) -> None:
    """Full tanks of 500 km at 8 L/100 km; from FITTED_KM on, consumption is shifted (a ratio)."""
    rng = random.Random(seed)
    start = dt.date(2025, 3, 1)
    entries = []
    for i in range(tanks):
        km = STEP_KM * i
        temperature = 12 + 10 * math.sin(i / 4)
        cold = 0.006 * max(0.0, 18 - temperature)
        rate = 0.08 * (1 + shift * (km > FITTED_KM) + cold + 0.01 * rng.gauss(0, 1))
        energy = STEP_KM * rate + sloppy * rng.gauss(0, 1)
        day = start + dt.timedelta(days=4 * i)
        columns = {name: rng.random() for name in extra}
        entries.append((Entry(vehicle, day, energy, km, temperature_c=temperature, extra=columns), {}))
    book.add_entries(entries, source="test")


@pytest.fixture(scope="module")
def logbook(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A van with a settled saving and a fresh roof rack, and a car with a change too small to be seen yet."""
    path = tmp_path_factory.mktemp("log") / "my.logbook"
    book = open_logbook(path, create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    book.add_vehicle(Vehicle("car", "petrol", "L", 50.0, distance_unit="mi"))
    drive(book, "van", 60, -0.12, 0.3, seed=1)
    drive(book, "car", 30, 0.0, 0.8, seed=2)
    book.fit("van", "side skirts", dt.date(2025, 6, 5), FITTED_KM)
    book.fit("car", "grille blanking", dt.date(2025, 6, 5), FITTED_KM, 2.5)
    book.close()
    return path


def answers(done: subprocess.CompletedProcess[str]) -> list[dict[str, Any]]:
    def refuse(constant: str) -> None:
        raise AssertionError(f"{constant} is not JSON (RFC 8259)")

    found = json.loads(done.stdout, parse_constant=refuse)
    assert list(found) == ["assessments"]
    return list(found["assessments"])


def test_one_answer_for_each_modification_of_each_vehicle(logbook: Path) -> None:
    done = run(logbook, "enough")
    assert done.returncode == 0, done.stderr
    lines = done.stdout.splitlines()
    assert lines[0] == "van: side skirts"
    assert lines[1].startswith("Yes: side skirts lowered consumption by 1")
    assert "car: grille blanking" in lines
    assert max(map(len, lines)) <= 80
    assert "\x1b" not in done.stdout


def test_parts_fitted_together_get_their_joint_answer_once(tmp_path: Path) -> None:
    book = open_logbook(tmp_path / "my.logbook", create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    drive(book, "van", 50, -0.12, 0.3, seed=1)
    for part in ("skirts", "fairing", "mirrors"):
        book.fit("van", part, dt.date(2025, 6, 5), FITTED_KM, 3.0 if part != "mirrors" else 8.0)
    said = " ".join(run(book.path, "enough", "--target", "3").stdout.split())
    assert said.startswith("Yes: skirts, fairing and mirrors together lowered consumption by")
    assert said.count("lowered consumption") == said.count("were never apart in this log") == 1
    assert "drive some full tanks with only one of them fitted" in said
    other_targets = run(book.path, "enough").stdout  # another question has an answer of its own
    assert other_targets.count("were never apart") == 2
    assert "van: skirts, fairing and mirrors together" in other_targets
    assert [a["modification"] for a in answers(run(book.path, "enough", "--json"))] == ["skirts", "fairing", "mirrors"]
    book.close()


def test_one_question_is_answered_without_a_heading_and_in_the_vehicles_own_miles(logbook: Path) -> None:
    done = run(logbook, "enough", "grille blanking")
    assert done.stdout.split(":")[0] in {"Not yet", "Out of reach"}
    assert " mi in " in done.stdout
    assert " km" not in done.stdout


def test_the_target_asked_for_comes_before_the_one_logged_and_that_before_the_usual_one(logbook: Path) -> None:
    targets = {a["vehicle"]: a["target_percent"] for a in answers(run(logbook, "enough", "--json"))}
    assert targets == {"van": pytest.approx(3.0), "car": pytest.approx(2.5)}
    asked = answers(run(logbook, "enough", "--vehicle", "car", "--target", "30", "--json"))
    assert [a["target_percent"] for a in asked] == [pytest.approx(30.0)]


def test_exit_code_tells_not_yet(logbook: Path) -> None:
    waiting = run(logbook, "enough", "--vehicle", "car", "--json", "--exit-code")
    verdict = answers(waiting)[0]["verdict"]
    assert waiting.returncode == (10 if verdict == "not-yet" else 0)
    settled = run(logbook, "enough", "--vehicle", "van", "--json", "--exit-code")
    assert answers(settled)[0]["verdict"] == "shifted"
    assert settled.returncode == 0


def test_the_answer_is_kept_for_later_entries(logbook: Path) -> None:
    run(logbook, "enough", "--vehicle", "van")
    book = open_logbook(logbook)
    kept = {found["modification"]: found for found in book.assessments("van")}["side skirts"]
    assert kept["verdict"] == "shifted"
    assert kept["at_km"] == pytest.approx(59 * STEP_KM)
    assert "looks" not in kept


@pytest.mark.skipif(os.name != "posix", reason="POSIX pipes")
def test_the_answer_is_kept_though_its_reader_leaves(logbook: Path, tmp_path: Path) -> None:
    copy = tmp_path / "copy.logbook"
    with sqlite3.connect(logbook) as source, sqlite3.connect(copy) as target:
        source.backup(target)
        target.execute("DELETE FROM assessment")
    source.close()
    target.close()
    read, write = os.pipe()
    os.close(read)
    command = [sys.executable, "-m", "energytrack", "--logbook", str(copy), "enough", "--vehicle", "van"]
    subprocess.run(command, cwd=ROOT, stdout=write, stderr=subprocess.PIPE, timeout=300)
    os.close(write)
    book = open_logbook(copy)
    assert isinstance(book, Store)
    assert [found["modification"] for found in book.assessments("van")] == ["side skirts"]
    book.close()


def test_plan_compares_and_says_what_was_fitted(logbook: Path) -> None:
    done = run(logbook, "plan", "--vehicle", "van", "--target", "2")
    assert done.returncode == 0, done.stderr
    assert "to show 2 %" in done.stdout
    assert "side skirts: from 12,000 km, still on" in done.stdout
    assert max(map(len, done.stdout.splitlines())) <= 80
    plans = json.loads(run(logbook, "plan", "--json").stdout)["plans"]
    assert [found["vehicle"] for found in plans] == ["van", "car"]
    assert {"one-switch", "best-date", "on-off-on", "alternate"} < {design["name"] for design in plans[0]["designs"]}


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["enough", "spoiler"], "no modification named 'spoiler'; logged: side skirts, grille blanking"),
        (["enough", "--vehicle", "bus"], "van"),
        (["enough", "--vehicle", "van", "--target", "0"], "at most at 50"),
        (["enough", "--vehicle", "van", "--target", "51"], "at most at 50"),
        (["enough", "--vehicle", "van", "--confidence", "2"], "confidence"),
        (["plan", "--vehicle", "bus"], "van"),
        (["plan", "--vehicle", "van", "--target", "-1"], "at most at 50"),
        (["enough", "--vehicle", "van", "--covariate", "payload"], "payload"),
    ],
)
def test_refusals_are_one_line_and_status_1(logbook: Path, words: list[str], said: str) -> None:
    done = run(logbook, *words)
    assert done.returncode == 1
    assert done.stdout == ""
    assert done.stderr.startswith("energytrack: ")
    assert len(done.stderr.splitlines()) == 1
    assert said in done.stderr


def test_an_empty_logbook_says_what_to_log(tmp_path: Path) -> None:
    book = open_logbook(tmp_path / "new.logbook", create=True)
    assert isinstance(book, Store)
    none = run(book.path, "enough")
    assert (none.returncode, none.stdout) == (1, "")
    assert "no vehicle yet" in none.stderr
    book.add_vehicle(Vehicle("van", "diesel", "L"))
    book.close()
    unmodified = run(book.path, "enough")
    assert (unmodified.returncode, unmodified.stdout) == (1, "")
    assert 'energytrack mod fitted "NAME" ODOMETER' in unmodified.stderr
    assert len(unmodified.stderr.splitlines()) == 1


def test_a_vehicle_that_cannot_be_answered_for_does_not_hide_the_answer_of_another(tmp_path: Path) -> None:
    book = open_logbook(tmp_path / "two.logbook", create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    book.add_vehicle(Vehicle("bus", "diesel", "L"))
    drive(book, "van", 60, -0.12, 0.3, seed=1, extra=("payload",))
    drive(book, "bus", 40, 0.0, 0.3, seed=2)
    book.fit("van", "side skirts", None, FITTED_KM)
    book.fit("bus", "side skirts", None, FITTED_KM)
    book.close()
    done = run(book.path, "enough", "side skirts", "--covariate", "payload", "--json")
    assert [a["vehicle"] for a in answers(done)] == ["van"]
    assert done.returncode == 1
    assert done.stderr.startswith("energytrack: bus, side skirts: ")


def test_a_terminal_without_the_degree_sign_still_gets_the_answer(logbook: Path) -> None:
    assert "per degree below 18 ?C" in run(logbook, "enough", "side skirts", encoding="ascii").stdout


def test_hostile_names_reach_no_terminal(tmp_path: Path) -> None:
    book = open_logbook(tmp_path / "odd.logbook", create=True)
    assert isinstance(book, Store)
    name = "\x1b[2J[red]\u202e"
    book.add_vehicle(Vehicle("van", "diesel", "L"))
    drive(book, "van", 40, -0.12, 0.3, seed=1)
    book.fit("van", name, None, FITTED_KM)
    book.close()
    for words in (["enough"], ["plan"], ["enough", "--json"], ["enough", "no such part"]):
        done = run(book.path, *words)
        assert "[red]" in done.stdout + done.stderr
        assert "\x1b" not in done.stdout + done.stderr
        assert "\u202e" not in done.stdout + done.stderr


def test_a_mistyped_option_is_wrong_usage(logbook: Path) -> None:
    assert run(logbook, "enough", "--jsno").returncode == 2
    assert run(logbook, "plan", "--jsno").returncode == 2


def test_a_vehicle_without_entries_is_told_what_to_drive(tmp_path: Path) -> None:
    book = open_logbook(tmp_path / "new.logbook", create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("van", "diesel", "L"))
    book.fit("van", "side skirts", None, FITTED_KM)
    book.close()
    done = run(book.path, "enough")
    assert done.returncode == 0
    assert done.stdout.startswith("No baseline: there is nothing measured without side skirts")
    assert "Drive about 3,200 km without it" in done.stdout.replace("\n", " ")
    assert run(book.path, "plan").stdout.startswith("No plan yet: 0 segments")


def test_no_logbook_named() -> None:
    done = run(None, "enough")
    assert done.returncode == 1
    assert "--logbook" in done.stderr


def test_variants_are_compared_on_the_command_line(tmp_path: Path) -> None:
    """Three variants of a part in one logbook: a sentence, six pairs and as many chances as there are variants."""
    entries, parts = fit_parts(plain_log(4), VARIANTS)
    vehicle = entries["vehicle"].iloc[0]
    pd.DataFrame({"vehicle": [vehicle], "carrier": ["diesel"], "unit": ["L"], "capacity": [75.0]}).to_csv(
        tmp_path / "vehicles.csv", index=False
    )
    entries.to_csv(tmp_path / "entries.csv", index=False)
    parts.assign(fitted_date=None, removed_date=None).to_csv(tmp_path / "modifications.csv", index=False)
    shown = run(tmp_path, "enough", "--compare")
    assert shown.stdout.startswith("dam B uses least")
    assert shown.stdout.count("look-proof range") == 6
    assert max(map(len, shown.stdout.splitlines())) <= 80
    told = json.loads(run(tmp_path, "enough", "--compare", "--json").stdout)
    assert len(told["comparisons"][0]["standings"]) == 4


# Rules for looks and known changes


def test_looks_taken_are_recorded_once_for_each_new_segment(logbook: Path) -> None:
    for words in (("grille blanking",), ("grille blanking", "--json"), ("grille blanking", "--looks", "counted")):
        assert run(logbook, "enough", *words).returncode == 0
    book = open_logbook(logbook)
    assert book.looks("car", "grille blanking") == [STEP_KM * 29]


@pytest.mark.parametrize("asked", [("--target", "2"), ("--confidence", "0.9"), ("--keep-all",)])
def test_a_question_in_passing_is_a_look_but_its_answer_is_not_kept(tmp_path: Path, asked: tuple[str, str]) -> None:
    """The shift shown is the same whatever the target, so whoever counts looks must count this one."""
    path = tmp_path / "my.logbook"
    book = open_logbook(path, create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("car", "petrol", "L", 50.0))
    drive(book, "car", 30, 0.0, 0.8, seed=2)
    book.fit("car", "grille blanking", dt.date(2025, 6, 5), FITTED_KM)
    assert run(path, "enough", "--looks", "counted", *asked).returncode == 0
    assert book.looks("car", "grille blanking") == [STEP_KM * 29]
    assert book.assessments("car") == []


def test_only_looks_taken_count_when_they_are_counted(tmp_path: Path) -> None:
    path = tmp_path / "my.logbook"
    book = open_logbook(path, create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("car", "petrol", "L", 50.0))
    drive(book, "car", 40, -0.02, 0.5, seed=4)
    book.fit("car", "blanking", dt.date(2025, 6, 5), FITTED_KM)
    for tank in (28, 33):
        book.record_look("car", "blanking", STEP_KM * tank, dt.date(2025, 7, 1))
    book.close()
    (counted,) = answers(run(path, "enough", "--looks", "counted", "--json"))
    (every,) = answers(run(path, "enough", "--json"))
    assert (counted["rule"], every["rule"]) == ("counted", "every-look")
    assert [look["odometer_km"] for look in counted["looks"]] == [STEP_KM * tank for tank in (28, 33, 39)]
    assert len(every["looks"]) == 15
    bounds = {look["odometer_km"]: look["bound"] for look in every["looks"]}
    assert counted["looks"][-1]["bound"] < bounds[STEP_KM * 39]


def test_an_open_ended_watch(logbook: Path) -> None:
    (answer,) = answers(run(logbook, "enough", "grille blanking", "--open-ended", "--json"))
    assert answer["rule"] == "open-ended"
    assert answer["verdict"] in ("not-yet", "shifted")
    assert answer["distance_expected_km"] is None


@pytest.mark.parametrize(
    ("words", "says"),
    [(("--looks", "some"), "every, counted"), (("--looks", "counted", "--open-ended"), "leave --looks counted out")],
)
def test_rules_that_cannot_be_are_refused(logbook: Path, words: tuple[str, ...], says: str) -> None:
    done = run(logbook, "enough", *words)
    assert done.returncode == 2
    assert says in done.stderr
    assert done.stdout == ""


def test_a_folder_keeps_no_looks_to_count() -> None:
    done = run(ROOT / "demo_logbook", "enough", "--vehicle", "van", "--looks", "counted")
    assert done.returncode != 0
    assert "keeps no looks" in done.stderr
    assert "Traceback" not in done.stderr


def test_a_known_change_is_logged_and_answered(tmp_path: Path) -> None:
    path = tmp_path / "my.logbook"
    book = open_logbook(path, create=True)
    assert isinstance(book, Store)
    book.add_vehicle(Vehicle("car", "petrol", "L", 50.0))
    drive(book, "car", 45, 0.08, 0.3, seed=5)
    book.close()
    fitted = run(path, "mod", "fitted", "windows open", str(FITTED_KM), "--known", "5:12")
    assert fitted.stdout.splitlines()[0].endswith("; a known change, +5 to +12 % expected")
    (answer,) = answers(run(path, "enough", "--json"))
    assert (answer["known_percent"], answer["known_change"]) == ([5.0, 12.0], "seen")
    said = " ".join(run(path, "enough").stdout.split())
    assert "A known change, +5 to +12 % expected, was seen: this log can show a shift of" in said
    assert "It has shown what it was for: take it off" in said
    assert "It costs energy" not in said
    listed = json.loads(run(path, "mod", "list", "--json").stdout)["modifications"]
    assert (listed[0]["known"], listed[0]["reversible"]) == ([5.0, 12.0], True)
    assert run(path, "mod", "list").stdout.splitlines()[-1].endswith("+5 to +12 % expected")


@pytest.mark.parametrize("known", ["9:4", "-4:9", "0:5", "4", "4:", "four:nine", "5:900", "nan:9"])
def test_known_changes_that_cannot_be_are_refused_and_nothing_is_logged(logbook: Path, known: str) -> None:
    before = open_logbook(logbook).modifications("van")
    done = run(logbook, "mod", "fitted", "windows", "29000", "--vehicle", "van", f"--known={known}")
    assert done.returncode != 0
    assert done.stderr.startswith("energytrack: ")
    assert len(done.stderr.splitlines()) == 1
    assert open_logbook(logbook).modifications("van") == before


def test_a_saving_may_be_known_and_a_part_irreversible(logbook: Path) -> None:
    done = run(
        logbook, "mod", "fitted", "remap", "29000", "--vehicle", "van", "--known", "-9:-4", "--not-reversible", "--json"
    )
    assert done.returncode == 0, done.stderr
    remap = open_logbook(logbook).modifications("van")[-1]
    assert (remap.name, remap.known, remap.reversible) == ("remap", (-9.0, -4.0), False)


@pytest.mark.parametrize("further", [("side skirts",), ("--open-ended",), ("--picture",), ("--exit-code",)])
def test_a_comparison_refuses_what_it_would_ignore(logbook: Path, further: tuple[str, ...]) -> None:
    done = run(logbook, "enough", "--compare", *further)
    assert done.returncode == 2
    assert "--compare takes no" in done.stderr
