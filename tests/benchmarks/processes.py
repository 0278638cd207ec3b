"""`fillup` against a hello-world command of the same framework; `enough` against the import of a statistics library."""

from __future__ import annotations

import datetime as dt
import json
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np

from tests.benchmarks.timing import HELLO, Comparison, compare, energytrack, run, seconds_of
from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE

STATISTICS = "import statsmodels.regression.linear_model"
ENTRIES, LOOKS = 250, 60
REHEARSED, RUNS, MOST_SECONDS = 100, 500, 120.0


def fillup(logbook: Path, rounds: int = 31) -> Comparison:
    """One entry more to a log of 250."""
    last = json.loads(run(energytrack("--logbook", str(logbook), "entries", "--last", "1", "--json")))["entries"][0]

    def entry(turn: int) -> list[str]:
        odometer = f"{last['odometer_km'] + 300 * (turn + 1):.0f}"
        words = ("--logbook", str(logbook), "fillup", odometer, "24.5", "--temperature", "12", "--speed", "64")
        return list(energytrack(*words))

    hello = [sys.executable, "-c", HELLO, "world"]
    return compare("fillup", entry, "hello-world", hello, target=1.5, rounds=rounds)


def enough(logbook: Path, rounds: int = 9) -> Comparison:
    """The answer on 250 entries, with a look after each of the last 60, while the test is still open."""
    command = energytrack("--logbook", str(logbook), "enough")
    baseline = [sys.executable, "-c", STATISTICS]
    return compare("enough", lambda _: command, STATISTICS, baseline, target=2.0, rounds=rounds)


def review(logbook: Path, rounds: int = 9) -> Comparison:
    """The newest month of that vehicle: months at reference conditions, the open test, changes, money, CO2."""
    command = energytrack("--logbook", str(logbook), "review")
    baseline = [sys.executable, "-c", STATISTICS]
    return compare("review", lambda _: command, STATISTICS, baseline, target=2.0, rounds=rounds)


def rehearse(folder: Path) -> str:
    """500 logs like one of 100 entries, each looked at after every entry, on all cores."""
    logbook = write_logbook(folder, entries=REHEARSED, looks=REHEARSED // 2)
    first, second = (
        seconds_of(energytrack("--logbook", str(logbook), "rehearse", "--runs", str(runs))) for runs in (1, RUNS)
    )
    return (
        f"rehearse, {REHEARSED} entries, {RUNS} runs / 1 run: {second:.0f} s / {first:.1f} s = {second / first:.0f} "
        f"(target <= {MOST_SECONDS:g} s on two cores)"
    )


def describe(logbook: Path) -> str:
    """What `enough` is asked, so that a reader sees that it is the case stated."""
    answer = json.loads(run(energytrack("--logbook", str(logbook), "enough", "--json")))["assessments"][0]
    segments = answer["segments_baseline"] + answer["segments_modified"]
    return f"enough: {segments} segments, {len(answer['looks'])} looks, verdict {answer['verdict']}"


def write_logbook(folder: Path, entries: int = ENTRIES, looks: int = LOOKS) -> Path:
    """A logbook file of a steady commute, the part fitted for the last entries, its test still open."""
    use = replace(STEADY_COMMUTE, fillings=entries, switches=(1 - looks / entries,), shift_percent=0.0)
    log = simulate(use, np.random.default_rng(1), start=dt.date(2018, 1, 1))
    tables = folder / "tables"
    tables.mkdir(parents=True)
    (tables / "vehicles.csv").write_text(f"vehicle,carrier,unit,capacity\n{use.vehicle},petrol,L,{use.capacity}\n")
    for name, frame in (("entries", log.entries), ("modifications", log.modifications.assign(target_percent=1.0))):
        shown = frame.replace({True: "yes", False: "no"}) if name == "entries" else frame
        shown.to_csv(tables / f"{name}.csv", index=False, date_format="%Y-%m-%d")
    logbook = folder / "bench.logbook"
    run(energytrack("--logbook", str(logbook), "new"))
    run(energytrack("--logbook", str(logbook), "import", str(tables)))
    return logbook
