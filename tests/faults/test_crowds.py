"""Many programs at one logbook at once: none lost, none doubled, and those who read are always answered."""

from __future__ import annotations

import datetime as dt
import itertools
import subprocess
import sys
from pathlib import Path

from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store
from tests.faults.commands import command, done, environment, is_sound, run

WRITERS, EACH, COMMANDS = 16, 200, 12
DAY = dt.date(2025, 5, 3)

WRITER = """
import datetime as dt, sys
from pathlib import Path
from energytrack.logbook.checks import check_place
from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store
path, own, writers, each = Path(sys.argv[1]), *map(int, sys.argv[2:])
store = Store(path)
car = store.vehicle("car")
for turn in range(each):
    place = turn * writers + own
    entry = Entry("car", dt.date(2025, 5, 3) + dt.timedelta(place // 100), 2.0, 1000.0 + 20 * place, note=str(own))
    with store.transaction():
        check_place(entry, car, *store.neighbours(entry), store.twin(entry))
        number = store.add_entry(entry, {})
    print(number, flush=True)
"""


def crowded(path: Path) -> Path:
    """A car for the crowd, and a van with a part to be answered about meanwhile."""
    store = Store.create(path)
    store.add_vehicle(Vehicle("car", "petrol", "L", 50.0))
    store.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    draw = itertools.cycle((40.0, 41.5, 39.2, 40.7, 40.1))
    logged = [Entry("van", DAY + dt.timedelta(3 * n), next(draw), 10_000.0 + 500 * n) for n in range(24)]
    store.add_entries([(entry, {}) for entry in logged], "log.csv")
    store.fit("van", "skirts", None, 16_000.0, target=3.0)
    store.close()
    return path


def started(words: list[str]) -> subprocess.Popen[str]:
    return subprocess.Popen(words, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment())


def test_sixteen_programs_write_two_hundred_entries_each(tmp_path: Path) -> None:
    path = crowded(tmp_path / "my.logbook")
    words = [sys.executable, "-c", WRITER, str(path)]
    writers = [started([*words, str(own), str(WRITERS), str(EACH)]) for own in range(WRITERS)]
    typed = [(22_000 + 300 * n, f"2025-08-{1 + n:02d}") for n in range(COMMANDS)]
    typists = []
    answers = []
    for km, day in typed:
        line = ("fillup", km, 25, "--vehicle", "van", "--date", day)
        typists.append(started(command(path, *line)))
        if any(writer.poll() is None for writer in writers):
            answers.append(run(path, *(("enough", "--vehicle", "van") if len(answers) % 3 == 0 else ("entries",))))
    while any(writer.poll() is None for writer in writers):
        answers.append(run(path, "entries", "--vehicle", "car"))
    numbers = [int(line) for writer in writers for line in writer.communicate(timeout=120)[0].split()]
    assert [writer.returncode for writer in writers] == [0] * WRITERS
    complaints = [typist.communicate(timeout=120)[1] for typist in typists]
    assert [typist.returncode for typist in typists] == [0] * COMMANDS, complaints

    assert [answer.returncode for answer in answers] == [0] * len(answers), [answer.stderr for answer in answers]
    said = [line for answer in answers for line in answer.stderr.splitlines()]
    assert [line for line in said if "; waiting up to" not in line] == []  # `enough` notes its look, and may wait
    assert answers  # how many depends on the machine
    store = Store(path)
    entries = store.entries("car")
    assert [entry.odometer_km for entry in entries] == [1000.0 + 20 * place for place in range(WRITERS * EACH)]
    assert [entry.note for entry in entries] == [str(place % WRITERS) for place in range(WRITERS * EACH)]
    assert sorted(entry.id or 0 for entry in entries) == sorted(numbers)
    assert [(entry.odometer_km, str(entry.date)) for entry in store.last_entries("van", COMMANDS)] == typed
    store.close()
    assert is_sound(path)
    assert "3,236" in done(path, "check")


def test_of_programs_with_the_same_entry_one_is_right(tmp_path: Path) -> None:
    path = crowded(tmp_path / "my.logbook")
    line = command(path, "fillup", 30_000, 40, "--vehicle", "van", "--date", "2025-09-01")
    racers = [started(line) for _ in range(8)]
    ended = [(*racer.communicate(timeout=60), racer.returncode) for racer in racers]
    assert sorted(status for *_, status in ended) == [0] + [1] * 7
    assert all("is logged already" in complaint for _, complaint, status in ended if status == 1)
