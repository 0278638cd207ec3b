"""A logbook of a million entries: import, then `fillup` and `entries` against an empty one.

`python -m tests.benchmarks.scale [ROWS]`. Nothing heavy is imported here: the memory of a process counts from what the
one that started it held.
"""

from __future__ import annotations

import csv
import datetime as dt
import json
import os
import random
import sqlite3
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

from tests.benchmarks.timing import HELLO, compare, energytrack, run, seconds_of

ROWS, SMALLER = 1_000_000, 10
LEAST_ROWS_A_SECOND, MOST_RATIO, MOST_SECONDS = 50_000, 1.5, 0.3
VEHICLES = {"one vehicle": 1, "200 vehicles": 200}
_PER_MEBIBYTE = 1024**2 if sys.platform == "darwin" else 1024  # ru_maxrss counts bytes there, KiB elsewhere


def write_table(path: Path, rows: int, vehicles: int) -> Path:
    """Entries in driving order, vehicle after vehicle, as a fleet's own export has them."""
    draw = random.Random(1)
    with path.open("w", encoding="utf-8") as file:
        file.write("vehicle,date,odometer_km,energy,full,temperature_c,cost,note\n")
        for vehicle in range(vehicles):
            km, each = 1_000.0, rows // vehicles
            for row in range(each):
                km += draw.uniform(2, 9)
                day = dt.date(2000, 1, 1) + dt.timedelta(row * 9_000 // each)
                amounts = f"{draw.uniform(30, 60):.2f},yes,{draw.uniform(-5, 30):.1f},{draw.uniform(40, 90):.2f}"
                file.write(f"v{vehicle},{day},{km:.1f},{amounts},\n")
    return path


def logbook(folder: Path, name: str, vehicles: int) -> Path:
    """A logbook with vehicles and no entries."""
    path = folder / f"{name}.logbook"
    run(energytrack("--logbook", str(path), "new"))
    tables = folder / name
    tables.mkdir()
    lines = ["vehicle,carrier,capacity", *(f"v{number},diesel,70" for number in range(vehicles))]
    (tables / "vehicles.csv").write_text("\n".join(lines) + "\n")
    (tables / "entries.csv").write_text("vehicle,date,odometer_km,energy\n")
    run(energytrack("--logbook", str(path), "import", str(tables)))
    return path


def imported(path: Path, table: Path) -> tuple[float, float, float]:
    """Wall-clock and CPU seconds of the import as a process, and the MiB it held at most."""
    start = time.perf_counter()
    process = subprocess.Popen(energytrack("--logbook", str(path), "import", str(table)), stdout=subprocess.DEVNULL)
    _, status, used = os.wait4(process.pid, 0)
    if status:
        raise subprocess.CalledProcessError(status, "import")
    process.returncode = 0
    return time.perf_counter() - start, used.ru_utime + used.ru_stime, used.ru_maxrss / _PER_MEBIBYTE


def floor(folder: Path, table: Path) -> float:
    """CPU seconds of the least there is to do: the rows through the csv module into a table with two indexes."""
    start = time.process_time()
    connection = sqlite3.connect(folder / "floor.sqlite", isolation_level=None)
    connection.execute("CREATE TABLE entry (id INTEGER PRIMARY KEY, v, d, km REAL, e REAL, f, t REAL, c REAL, n)")
    connection.execute("CREATE INDEX by_date ON entry (v, d, km)")
    connection.execute("CREATE INDEX by_km ON entry (v, km, d)")
    connection.execute("BEGIN")
    with table.open(encoding="utf-8", newline="") as file:
        rows = csv.reader(file)
        next(rows)
        connection.executemany("INSERT INTO entry (v, d, km, e, f, t, c, n) VALUES (?, ?, ?, ?, ?, ?, ?, ?)", rows)
    connection.execute("COMMIT")
    connection.close()
    return time.process_time() - start


def scale(rows: int = ROWS) -> Iterator[str]:
    """One line a figure."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for kind, vehicles in VEHICLES.items():
            path = logbook(folder, f"of {kind}", vehicles)
            table = write_table(folder / f"{kind}.csv", rows, vehicles)
            small = write_table(folder / f"{kind}, fewer.csv", rows // SMALLER, vehicles)
            held = imported(logbook(folder, f"fewer of {kind}", vehicles), small)[2]
            seconds, spent, most = imported(path, table)
            speed = f"{rows / seconds:,.0f} rows a second, {rows / spent:,.0f} a CPU second"
            yield f"import, {rows:,} rows of {kind}: {speed} (target >= {LEAST_ROWS_A_SECOND:,})"
            yield f"  CPU: {spent / floor(folder, table):.1f} x that of bare csv and SQLite"
            yield f"  memory: {most:.0f} MiB, {most / held:.2f} x that of {SMALLER} times fewer rows"
            (folder / "floor.sqlite").unlink()
        yield from daily(path, logbook(folder, "empty", 1), rows)


def daily(large: Path, empty: Path, rows: int) -> Iterator[str]:
    """What is done every day, on the large logbook and on the empty one."""

    listing = energytrack("--logbook", str(large), "entries", "--vehicle", "v0", "--last", "1", "--json")
    last = json.loads(run(listing))["entries"][0]["odometer_km"]

    def entry(path: Path, turn: int) -> list[str]:
        words = ("--vehicle", "v0", "--date", "2024-09-01", "--temperature", "12")
        return list(energytrack("--logbook", str(path), "fillup", f"{last + 25 * (turn + 1):.0f}", "24.5", *words))

    turns = iter(range(10_000))
    run(entry(empty, next(turns)))
    start_up = [sys.executable, "-c", HELLO, "world"]
    both = [(seconds_of(entry(large, next(turns))), seconds_of(entry(empty, next(turns)))) for _ in range(21)]
    ratio = sorted(one for one, _ in both)[10] / sorted(other for _, other in both)[10]
    yield f"fillup, {rows:,} entries / an empty logbook: {ratio:.2f} (target <= {MOST_RATIO:g})"
    listing = energytrack("--logbook", str(large), "entries", "--last", "20", "--vehicle", "v0")
    listed = compare("entries --last 20", lambda _: listing, "hello-world", start_up, target=MOST_SECONDS, rounds=11)
    beyond = listed.seconds - listed.baseline_seconds
    yield f"entries --last 20 of {rows:,}: {beyond:.2f} s beyond start-up (target <= {MOST_SECONDS:g} s)"


if __name__ == "__main__":
    for told in scale(int(sys.argv[1]) if len(sys.argv) > 1 else ROWS):
        print(told, flush=True)
