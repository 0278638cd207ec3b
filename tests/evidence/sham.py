"""Sham changes: real logs cut where nothing was fitted, and the cut called a modification."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, fields, replace
from pathlib import Path

import numpy as np
import pandas as pd
from scipy.special import stdtrit

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.looks import finding, take_looks
from tests.evidence import usual
from tests.evidence.block import Block, middle, rate
from tests.evidence.cores import across_cores
from tests.evidence.logs import QUESTION

SIDES = (10, 20, 40)  # segments before the cut, and as many after it
FEWEST_SEGMENTS = 2 * max(SIDES)  # of a log that is used at all
COLUMNS = {"energy_litres": "energy", "energy_kwh": "energy", "mean_speed_kmh": "speed_kmh"}
HEADING = (
    "segments a side",
    "cuts (without overlap)",
    "two averages",
    "regression",
    "energytrack, Student's t",
    "energytrack, mixture",
    "energytrack, each look: shifted",
    "median standard error, %",
)


@dataclass(frozen=True)
class Cut:
    """A stretch of a log with a sham change in its middle."""

    observed: Observations
    side: int


@dataclass(frozen=True)
class Claims:
    """Who claimed a shift at one cut."""

    side: int
    averages: bool
    regression: bool
    student: bool
    mixture: bool
    each_look: bool
    standard_error: float  # %


def read_log(path: Path) -> Observations:
    """Segments of one log. The unit follows the energy column; undated rows are left out."""
    rows = pd.read_csv(path)
    unit = "kWh" if "energy_kwh" in rows else "L"
    rows = rows.rename(columns=COLUMNS).drop(columns="note", errors="ignore")
    rows["date"] = pd.to_datetime(rows["date"])
    rows["vehicle"] = "sham"
    return observe_frames(rows[rows["date"].notna()], unit=unit)[0]


def cuts(observed: Observations, side: int) -> list[Cut]:
    """Stretches that overlap by three quarters: every part of the log serves as before and as after."""
    starts = range(0, len(observed) - 2 * side + 1, max(side // 2, 5))
    return [Cut(_stretch(observed, start, side), side) for start in starts]


def _stretch(observed: Observations, start: int, side: int) -> Observations:
    part = slice(start, start + 2 * side)
    arrays = {
        field.name: getattr(observed, field.name)[part].copy()
        for field in fields(observed)
        if isinstance(getattr(observed, field.name), np.ndarray)
    }
    arrays["linked"][0] = False
    for of_the_sham in ("shares", "fitted", "levels"):
        arrays[of_the_sham] = np.repeat([0.0, 1.0], side)[:, None]
    return replace(
        observed,
        **arrays,
        names=(QUESTION.modification,),
        conditions={name: values[part] for name, values in observed.conditions.items()},
        known_share={name: values[part] for name, values in observed.known_share.items()},
    )


def claims(cut: Cut) -> Claims:
    states = take_looks(cut.observed, QUESTION, every=True)
    now, found = states[-1], finding(states, QUESTION.target)
    size, freedom = abs(now.shift.z), now.shift.freedom
    return Claims(
        cut.side,
        usual.averages_differ(cut.observed),
        usual.regression_differs(now.model),
        size > -float(stdtrit(freedom, 0.025)),
        size > mixture_quantile(0.025, freedom),
        found is not None and found[0] == "shifted",
        100 * now.shift.standard_error,
    )


def blocks(folder: Path) -> Iterator[Block]:
    """The one table, from every CSV file of a folder whose log is long enough. Raises ValueError where none is."""
    logs = [log for log in map(read_log, sorted(folder.glob("*.csv"))) if len(log) >= FEWEST_SEGMENTS]
    if not logs:
        raise ValueError(f"{folder} has no log of {FEWEST_SEGMENTS} segments or more")
    results = across_cores(claims, [cut for log in logs for side in SIDES for cut in cuts(log, side)])
    disjoint = {side: sum(len(log) // (2 * side) for log in logs) for side in SIDES}
    rows = [_row(str(side), [one for one in results if one.side == side], disjoint[side]) for side in SIDES]
    text = f"{len(logs)} logs of {', '.join(str(len(log)) for log in logs)} segments, nothing drawn at random"
    yield Block("sham", "sham FOLDER", text, HEADING, tuple(rows))


def _row(name: str, results: Sequence[Claims], disjoint: int) -> tuple[str, ...]:
    return (
        name,
        f"{len(results)} ({disjoint})",
        rate((one.averages for one in results), disjoint),
        rate((one.regression for one in results), disjoint),
        rate((one.student for one in results), disjoint),
        rate((one.mixture for one in results), disjoint),
        rate((one.each_look for one in results), disjoint),
        middle((one.standard_error for one in results), 1),
    )
