"""The logging commands as processes: what is said, the exit status, and what is in the logbook afterwards."""

from __future__ import annotations

import json
import os
import sqlite3
import subprocess
import sys
from pathlib import Path

import pytest

from energytrack.cli.cautions import CAUTIONS

ROOT = Path(__file__).parents[2]
TABLES = ("vehicle", "entry", "switch", "event")


class Terminal:
    """Runs commands on one logbook and reads its tables."""

    def __init__(self, folder: Path) -> None:
        self.logbook = folder / "my.logbook"
        self.environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONIOENCODING": "utf-8"}
        self.environment.pop("ENERGYTRACK_LOGBOOK", None)

    def __call__(self, *arguments: str, logbook: Path | None = None) -> subprocess.CompletedProcess[str]:
        command = [sys.executable, "-m", "energytrack", "--logbook", str(logbook or self.logbook), *arguments]
        return subprocess.run(
            command,
            env=self.environment,
            stdin=subprocess.DEVNULL,
            capture_output=True,
            text=True,
            encoding="utf-8",
            timeout=60,
            check=False,
        )

    def done(self, *arguments: str) -> str:
        finished = self(*arguments)
        assert (finished.returncode, finished.stderr) == (0, "")
        return finished.stdout

    def rows(self) -> dict[str, list[tuple[object, ...]]]:
        connection = sqlite3.connect(self.logbook)
        try:
            return {name: connection.execute(f"SELECT * FROM {name}").fetchall() for name in TABLES}
        finally:
            connection.close()

    def refused(self, *arguments: str) -> str:
        """One clear line on stderr, exit status 1, nothing written."""
        before = self.rows()
        finished = self(*arguments)
        assert (finished.returncode, finished.stdout) == (1, "")
        assert finished.stderr.startswith("energytrack: ")
        assert finished.stderr.count("\n") == 1
        assert self.rows() == before
        return finished.stderr


@pytest.fixture
def run(tmp_path: Path) -> Terminal:
    terminal = Terminal(tmp_path)
    terminal.done("new")
    terminal.done("vehicle", "add", "van", "--carrier", "diesel", "--capacity", "70")
    terminal.done("fillup", "48230", "41.32", "--date", "2026-05-03")
    terminal.done("fillup", "48900", "40.1", "--date", "2026-05-10")
    return terminal


BAD_ENTRIES = [
    (["48100", "40"], "odometer goes back"),
    (["48230", "40"], "odometer stands still"),
    (["48900", "40"], "odometer stands still"),
    (["53000", "40", "--date", "2026-05-11"], "a jump no vehicle drives"),
    (["49500", "0"], "amount 0 must be more than 0"),
    (["49500", "-4"], "amount -4 must be more than 0"),
    (["-5", "40"], "odometer -5 km is no odometer value"),
    (["49500", "91.5"], "more than 1.3 times the capacity"),
    (["49500", "40", "--level", "101"], "outside 0 to 100"),
    (["49500", "40", "--level", "-1"], "outside 0 to 100"),
    (["49500", "40", "--date", "2999-01-01"], "lies in the future"),
    (["49500", "40", "--date", "3.5.2026"], "such as 2026-05-03"),
    (["49500", "40", "--date", "2026-02-30"], "such as 2026-05-03"),
    (["49500", "41,32"], "write 41.32, not 41,32"),
    (["49,5", "41"], "write 49.5, not 49,5"),
    (["49,500", "41"], "can be read two ways: write 49500, or 49.500"),
    (["49500", "nan"], "is not a number"),
    (["inf", "40"], "is not a number"),
    (["49500", "40", "--vehicle", "bus"], "no vehicle 'bus' in this logbook; there are: van"),
    (["48900", "40", "--date", "2026-05-10"], "is logged already: add --again"),
    (["48500", "40", "--date", "2026-05-01"], "does not fit"),
    (["49500"], "the amount is missing"),
    ([], "the odometer value is missing"),
    (["--distance", "300", "40"], "have an odometer value"),
    (["49500", "40", "--unit", "kWh"], "use L, gal-us, gal-imp"),
    (["49500", "40", "--odometer-unit", "m"], "use km or mi"),
    (["49500", "40", "--temperature", "75"], "such as 54F"),
    (["49500", "40", "--speed", "0"], "no mean speed"),
    (["49500", "40", "--currency", "euro"], "ISO 4217"),
    (["49500", "40", "--set", "payload"], "is not name=value"),
    (["49500", "40", "--set", "energy=3"], "the name is taken"),
    (["49500", "40", "--note", "\udcff"], "not valid UTF-8"),
]


@pytest.mark.parametrize(("arguments", "said"), BAD_ENTRIES)
def test_bad_entries_are_refused_and_nothing_is_written(run: Terminal, arguments: list[str], said: str) -> None:
    assert said in run.refused("fillup", *arguments)


BAD_SWITCHES = [
    (["mod", "fitted", "skirts"], "say where"),
    (["mod", "fitted", "skirts", "-5"], "no odometer value"),
    (["mod", "fitted", "skirts", "48900", "--target", "0"], "at most 50 %"),
    (["mod", "fitted", "skirts", "48900", "--target", "51"], "at most 50 %"),
    (["mod", "fitted", "skirts", "48900", "--date", "2999-01-01"], "in the future"),
    (["mod", "fitted", " ", "48900"], "needs a name"),
    (["mod", "removed", "spoiler", "48900"], "fitted now: nothing"),
    (["event", "winter tyres", "48900", "--odometer-factor", "9"], "outside 0.5 to 2"),
    (["event", "", "48900"], "say what happened"),
    (["charge", "49500", "30"], "log it with `fillup`"),
    (["vehicle", "add", "van", "--carrier", "petrol"], "there is a vehicle 'van' already"),
    (["vehicle", "add", "bus", "--carrier", "steam"], "use one of petrol"),
    (["vehicle", "add", "bus", "--carrier", "petrol", "--capacity", "-3"], "must be more than 0"),
    (["vehicle", "add", "bus", "--carrier", "petrol", "--display", "mi/kWh"], "use L/100km, km/L, mpg-us, mpg-imp"),
    (["vehicle", "add", "bus", "--carrier", "petrol", "--unit", "kWh"], "petrol is not measured in kWh"),
    (["vehicle", "add", "b\x1bus", "--carrier", "petrol"], "printable"),
    (["new"], "exists already"),
]


@pytest.mark.parametrize(("arguments", "said"), BAD_SWITCHES)
def test_other_bad_input_is_refused_too(run: Terminal, arguments: list[str], said: str) -> None:
    assert said in run.refused(*arguments)


def test_wrong_usage_is_told_apart(run: Terminal) -> None:
    assert run("fillup", "49500", "40", "--nothing-like-it").returncode == 2
    assert run("nothing-like-it").returncode == 2


@pytest.mark.parametrize(
    "arguments",
    [["vehicle", "add", "--nam", "--carrier", "petrol"], ["mod", "fitted", "--targt", "3"], ["enough", "--al"]],
)
def test_a_misspelt_option_is_never_taken_for_a_name(run: Terminal, arguments: list[str]) -> None:
    before = run.rows()
    finished = run(*arguments)
    assert (finished.returncode, finished.stdout) == (2, "")
    assert "No such option: --" in finished.stderr
    assert run.rows() == before


def test_every_command_is_summed_up_whole(run: Terminal) -> None:
    said = run.done("--help")
    assert "..." not in said.partition("Commands:")[2]
    assert all(len(line) <= 80 for line in said.splitlines())


def test_no_logbook_named_or_there(run: Terminal, tmp_path: Path) -> None:
    absent = run("fillup", "1", "2", logbook=tmp_path / "absent")
    assert absent.returncode == 1
    assert absent.stderr.count("\n") == 1
    assert "new`" in absent.stderr
    command = [sys.executable, "-m", "energytrack", "entries"]
    unnamed = subprocess.run(command, env=run.environment, capture_output=True, text=True, timeout=60, check=False)
    assert unnamed.returncode == 1
    assert "ENERGYTRACK_LOGBOOK" in unnamed.stderr


def test_what_was_typed_is_kept_and_base_units_stored(run: Terminal) -> None:
    """The US gallon is 3.785411784 L and the mile 1.609344 km exactly (NIST SP 811, B.8)."""
    run.done("fillup", "31000", "10", "--unit", "gal-us", "--odometer-unit", "mi", "--temperature", "50F",
             "--speed", "88", "--set", "payload=300", "--json", "--date", "2026-05-20")  # fmt: skip
    entry = json.loads(run.done("entries", "--json", "--last", "1"))["entries"][0]
    assert entry["energy"] == pytest.approx(37.85411784)
    assert entry["odometer_km"] == pytest.approx(49889.664)
    assert (entry["temperature_c"], entry["speed_kmh"], entry["payload"]) == (10.0, 88.0, 300.0)
    connection = sqlite3.connect(run.logbook)
    typed = json.loads(connection.execute("SELECT typed FROM entry ORDER BY id DESC").fetchone()[0])
    connection.close()
    assert typed["amount"] == {"value": "10", "unit": "gal-us"}
    assert typed["odometer"] == {"value": "31000", "unit": "mi"}
    assert typed["temperature"] == {"value": "50F", "unit": "F"}


def test_the_echo_says_what_the_entry_meant(run: Terminal) -> None:
    """600 km on 42 L are 7 L/100 km."""
    assert "600 km since the last entry: 7.00 L/100 km" in run.done("fillup", "49500", "42")
    told = json.loads(run.done("fillup", "50100", "42", "--json", "--partial"))
    assert (told["energy"], told["full"]) == (42.0, False)
    assert any("600 km" in line for line in told["meaning"])


def test_a_forgotten_receipt_is_taken_between_two_others(run: Terminal) -> None:
    run.done("fillup", "48600", "22", "--date", "2026-05-06")
    entries = json.loads(run.done("entries", "--json"))["entries"]
    assert [entry["odometer_km"] for entry in entries] == [48230, 48600, 48900]


def test_again_insists_on_a_second_one(run: Terminal) -> None:
    run.done("fillup", "48900", "10", "--date", "2026-05-10", "--again")
    assert len(run.rows()["entry"]) == 3


def test_vehicles_in_miles_and_without_odometer(run: Terminal) -> None:
    run.done("vehicle", "add", "car", "--carrier", "petrol", "--capacity", "15", "--unit", "gal-us",
             "--distance-unit", "mi")  # fmt: skip
    assert "van, car" in run.refused("fillup", "1", "2")
    run.done("fillup", "10000", "10", "--vehicle", "car", "--date", "2026-05-01")
    assert "300 mi since the last entry: 30.0 mpg (US)" in run.done("fillup", "10300", "10", "--vehicle", "car")
    run.done("vehicle", "add", "quad", "--carrier", "electricity", "--capacity", "6")
    run.done("charge", "--distance", "40", "4.2", "--vehicle", "quad", "--date", "2026-05-01")
    again = ("charge", "--distance", "40", "4.2", "--vehicle", "quad", "--date", "2026-05-01")
    assert "logged already" in run.refused(*again)
    assert "log it with `charge`" in run.refused("fillup", "--distance", "40", "4.2", "--vehicle", "quad")
    assert run.done("vehicle", "list").count("\n") == 4


def test_modifications(run: Terminal) -> None:
    first = run.done("mod", "fitted", "side skirts", "48900", "--target", "3", "--date", "2026-05-10")
    assert " ".join(first.replace("\n", " ").split()).count(CAUTIONS[1]) == 1
    assert all(len(line) <= 80 for line in first.splitlines())
    assert "is fitted to van since" in run.refused("mod", "fitted", "side skirts", "48950")
    assert "fitted now: 'side skirts'" in run.refused("mod", "removed", "spoiler", "48950")
    graded = run.done("mod", "fitted", "side skirts", "49000", "--level", "2.4", "--date", "2026-05-12")
    assert graded.startswith("van: side skirts fitted, 49,000 km, 2026-05-12; level 2.4\n")
    run.done("mod", "removed", "side skirts", "--date", "2026-06-01")
    told = json.loads(run.done("mod", "list", "--json"))["modifications"]
    assert [(each["fitted_km"], each["removed_km"], each["level"]) for each in told] == [
        (48900, 49000, None),
        (49000, None, 2.4),
    ]
    assert told[1]["removed_date"] == "2026-06-01"


def test_modifications_are_listed_within_eighty_columns(run: Terminal) -> None:
    long = "side skirts with rear wheel covers"
    fitted = run.done("mod", "fitted", long, "48900", "--date", "2026-05-10", "--level", "5", "--known", "4:9")
    run.done("mod", "removed", long, "49000", "--date", "2026-05-12")
    run.done("mod", "fitted", "skirts", "49000", "--date", "2026-05-12", "--target", "2")
    listed = run.done("mod", "list").splitlines()
    assert max(map(len, [*fitted.splitlines(), *listed])) <= 80
    assert " ".join(" ".join(listed).split()) == (
        f"van {long} 48,900 km, 2026-05-10 to 49,000 km, 2026-05-12; level 5; a known change, +4 to +9 % expected "
        "van skirts 49,000 km, 2026-05-12, still on; target 2 %"
    )


def test_a_switch_logged_after_the_fact_has_no_day(run: Terminal) -> None:
    """Today would contradict the later entries."""
    run.done("mod", "fitted", "side skirts", "48500")
    told = json.loads(run.done("mod", "list", "--json"))["modifications"][0]
    assert (told["fitted_km"], told["fitted_date"]) == (48500, None)


@pytest.mark.parametrize("command", ["entries", "fillup"])
def test_nothing_typed_reaches_the_terminal_as_a_command(run: Terminal, command: str) -> None:
    """Escape sequences (ECMA-48) and the right-to-left override U+202E (Unicode UAX 9)."""
    evil = "a\x1b[31mred\x07\u202egnp\r\nb"
    fitted = run("mod", "fitted", evil, "48900")
    assert fitted.returncode == 1
    run.done("fillup", "49500", "40", "--note", evil, "--place", evil)
    said = run.done(command) if command == "entries" else run("fillup", "x" + evil, "40").stderr
    assert not set(said) & set("\x1b\x07\u202e\r")
    shown = json.loads(run.done("entries", "--json"))["entries"][-1]
    assert shown["note"] == evil


def test_an_unusual_entry_is_kept_and_flagged(run: Terminal) -> None:
    for number in range(1, 13):
        run.done("fillup", str(48900 + 600 * number), str(42 + number % 3), "--date", f"2026-06-{2 * number:02}")
    run.done("fillup", "56700", "80", "--date", "2026-06-28")
    flags = [entry["unusual"] for entry in json.loads(run.done("entries", "--json"))["entries"]]
    assert flags[-1]
    assert not any(flags[2:-1])
    assert "unusual" in run.done("entries").splitlines()[-1]


def test_two_processes_log_the_same_entry_and_one_wins(run: Terminal) -> None:
    command = [sys.executable, "-m", "energytrack", "--logbook", str(run.logbook), "fillup", "49500", "40"]
    both = [
        subprocess.Popen(command, env=run.environment, stdout=subprocess.PIPE, stderr=subprocess.PIPE) for _ in range(2)
    ]
    said = [process.communicate(timeout=60) for process in both]
    assert sorted(process.returncode for process in both) == [0, 1]
    assert sum(b"is logged already" in refusal for _, refusal in said) == 1
    assert len(run.rows()["entry"]) == 3


@pytest.mark.skipif(os.name != "posix", reason="POSIX pipes")
def test_a_reader_that_leaves_is_no_error(run: Terminal) -> None:
    read, write = os.pipe()
    os.close(read)
    command = [sys.executable, "-m", "energytrack", "--logbook", str(run.logbook), "entries"]
    done = subprocess.run(command, env=run.environment, stdout=write, stderr=subprocess.PIPE, timeout=60, check=False)
    os.close(write)
    assert done.stderr == b""


HEAVY = ("numpy", "pandas", "scipy", "statsmodels", "rich")


@pytest.mark.parametrize(
    "arguments", [["fillup", "49500", "42"], ["mod", "fitted", "skirts", "49500"], ["entries"], ["vehicle", "list"]]
)
def test_logging_loads_no_heavy_library(run: Terminal, arguments: list[str]) -> None:
    code = (
        "import sys\nfrom energytrack.cli.app import main\n"
        "try:\n    main()\nexcept SystemExit as end:\n    assert not end.code, end.code\n"
        f"print('heavy:', [name for name in {HEAVY} if name in sys.modules])"
    )
    command = [sys.executable, "-c", code, "--logbook", str(run.logbook), *arguments]
    done = subprocess.run(command, env=run.environment, capture_output=True, text=True, timeout=60, check=False)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.splitlines()[-1] == "heavy: []"


def test_units_are_taken_in_any_case_and_kept_as_they_are_written(run: Terminal) -> None:
    units = ("--unit", "KG", "--distance-unit", "KM", "--display", "KM/KG")
    run.done("vehicle", "add", "tractor", "--carrier", "cng", *units)
    run.done("fillup", "100", "12", "--vehicle", "tractor", "--date", "2026-05-03", "--unit", "LB")
    tractor = json.loads(run.done("vehicle", "list", "--json"))["vehicles"][1]
    assert (tractor["unit"], tractor["typed_unit"], tractor["distance_unit"]) == ("kg", "kg", "km")
    assert tractor["display"] == "km/kg"
    kept = json.loads(run.done("entries", "--vehicle", "tractor", "--json"))["entries"][0]
    assert kept["energy"] == pytest.approx(12 * 0.45359237)  # the pound is exact (NIST SP 811)
    units = ("--unit", "l", "--odometer-unit", "Km")
    run.done("fillup", "49500", "40", "--date", "2026-05-17", *units, "--vehicle", "van")
    refusal = run.refused("fillup", "49900", "40", "--date", "2026-05-20", "--unit", "kwh", "--vehicle", "van")
    assert "not measured in 'kWh'" in refusal
