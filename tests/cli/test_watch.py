"""The watch in a real logbook: begun by a heavy command, carried on by each echo, void after corrections."""

from __future__ import annotations

import datetime as dt
import subprocess
import sys
from pathlib import Path

import pytest

from energytrack.cli.watch import begun, columns, keep_watch, lines
from energytrack.inference.watch.kept import from_json
from energytrack.logbook import revisions
from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.store import Store

VAN = Vehicle("van", "diesel", "L", 70.0)
FIRST = dt.date(2025, 1, 3)
FULL = 40


def entry(number: int, times: float = 1.0) -> Entry:
    scatter = (0.4, -0.7, 0.1, 0.9, -0.5, -0.2, 0.6, -0.6)[number % 8]
    return Entry("van", FIRST + dt.timedelta(7 * number), (40 + scatter) * times, 10_000.0 + 600 * number)


@pytest.fixture
def store(tmp_path: Path) -> Store:
    made = Store.create(tmp_path / "my.logbook")
    made.add_vehicle(VAN)
    made.add_entries([(entry(number), {}) for number in range(FULL)], "test")
    keep_watch(made, VAN)
    return made


def logged(store: Store, number: int, times: float) -> str:
    """`fillup` as a process, and which heavy libraries it loaded."""
    new = entry(number, times)
    code = (
        "import sys\nfrom energytrack.cli.app import app\n"
        f"sys.argv = ['energytrack', '--logbook', {str(store.path)!r}, 'fillup', "
        f"'{new.odometer_km}', '{new.energy:.2f}', '--date', '{new.date}']\n"
        "try:\n    app()\nfinally:\n"
        "    print('heavy:', sorted({'numpy', 'pandas', 'scipy', 'statsmodels', 'rich'} & set(sys.modules)))\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_the_echo_tells_a_rise_and_loads_nothing_heavy(store: Store) -> None:
    assert "has stood" not in logged(store, FULL, 1.0)
    told = [logged(store, number, 1.10) for number in range(FULL + 1, FULL + 5)]
    assert "has stood" not in told[0]
    assert "above what is expected since about" in told[-1]
    assert "qualified person before further driving tests" in told[-1]
    assert all("heavy: []" in each for each in told)


@pytest.mark.parametrize("change", ["amended", "struck", "event", "older"])
def test_a_correction_makes_the_state_void_until_the_next_heavy_command(store: Store, change: str) -> None:
    assert store.watch("van") is not None
    old = store.entries("van")[10]
    if change == "amended":
        revisions.amend(store, Entry("van", old.date, old.energy + 1, old.odometer_km, id=old.id), {})
    elif change == "struck":
        revisions.strike(store, old)
    elif change == "event":
        store.add_event(Event("van", old.date, "winter tyres", old.odometer_km))
    else:
        store.add_entry(Entry("van", old.date, 20.0, 15_700.0), {})
    assert store.watch("van") is None
    keep_watch(store, VAN)
    assert store.watch("van") is not None


def test_carried_on_is_the_same_as_begun_with_all(store: Store) -> None:
    from energytrack.consumption.meaning import segmented_of
    from energytrack.inference.watch.kept import carried_on

    kept = from_json(store.watch("van") or {})
    store.add_entries([(entry(number), {}) for number in range(FULL, FULL + 5)], "test")
    log = segmented_of(VAN, store.last_entries("van", 20), [])
    watch = carried_on(kept, log, [])
    assert watch is not None
    assert watch.segments == kept.segments + 5
    assert watch.end_km == 10_000.0 + 600 * (FULL + 4)
    assert carried_on(kept._replace(last_energy=1.0), log, []) is None


def test_state_in_words_and_json(store: Store) -> None:
    one = begun(store, VAN, 50_000.0, with_delays=True)
    said = lines(VAN, one)
    assert all(len(line) <= 80 for line in said)
    assert "one every 50,000 km" in "\n".join(said)
    told = columns(VAN, one)
    assert told["alarm"] is False
    assert list(told["delays_km"]) == ["3", "5", "10"]
    assert columns(VAN, None) == {"vehicle": "van", "watching": False}
