"""Sham changes: real logs cut where nothing was fitted, and the cut called a modification."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from pathlib import Path

import numpy as np
import pandas as pd
from scipy.special import stdtrit

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.inference import bounds, rules
from energytrack.inference.looks import State, finding, judged, take_looks
from energytrack.inference.question import Question
from energytrack.logbook.checks import LARGEST_TARGET_PERCENT
from tests.evidence import goals, usual
from tests.evidence.block import Block
from tests.evidence.goals import ALL, Promise
from tests.evidence.logs import QUESTION
from tests.evidence.measure import Measured, middle, proportion, rate

SIDES = (10, 20, 40)  # segments before the cut, and as many after it
OPTIONS = "--sham FOLDER"
FEWEST_SEGMENTS = 2 * max(SIDES)  # of a log that is used at all
COLUMNS = {"energy_litres": "energy", "energy_kwh": "energy", "mean_speed_kmh": "speed_kmh"}
HEADING = (
    "segments a side",
    "cuts (without overlap)",
    "two averages",
    "regression",
    "energytrack, Student's t",
    "energytrack, mixture",
    "goal",
    "verdict",
    "energytrack, each look: shifted",
    "verdict",
    "each look, target within reach: shifted",
    "verdict",
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
    within_reach: bool  # each look, asked for what the stretch can just settle
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
    now = states[-1]
    size, freedom = abs(now.shift.z), now.shift.freedom
    return Claims(
        cut.side,
        usual.averages_differ(cut.observed),
        usual.regression_differs(now.model),
        size > -float(stdtrit(freedom, 0.025)),
        size > bounds.mixture_quantile(0.025, freedom),
        _shifted(states, QUESTION),
        _shifted_within_reach(states),
        100 * now.shift.standard_error,
    )


def _shifted(states: Sequence[State], question: Question) -> bool:
    found = finding(states, question.target)
    return found is not None and found[0] == "shifted"


def _shifted_within_reach(states: Sequence[State]) -> bool:
    """The same looks, asked for a target that makes the information complete at the last of them."""
    last = states[-1].shift
    target = QUESTION.drift * last.standard_error * bounds.price(last.freedom, QUESTION.alpha)
    question = replace(QUESTION, target=min(target, LARGEST_TARGET_PERCENT / 100))
    watch = rules.watch(question.rule, question.alpha)
    return _shifted([judged(state.model, question, watch) for state in states], question)


def logs_of(folder: Path) -> list[Observations]:
    """Every CSV file of a folder whose log is long enough. Raises ValueError where none is."""
    logs = [log for log in map(read_log, sorted(folder.glob("*.csv"))) if len(log) >= FEWEST_SEGMENTS]
    if not logs:
        raise ValueError(f"{folder} has no log of {FEWEST_SEGMENTS} segments or more")
    return logs


def all_cuts(logs: Sequence[Observations]) -> list[Cut]:
    return [cut for log in logs for side in SIDES for cut in cuts(log, side)]


def blocks(results: Sequence[Claims], logs: Sequence[Observations]) -> list[Block]:
    """The goals and the one table."""
    text = f"{len(logs)} logs of {', '.join(str(len(log)) for log in logs)} segments, nothing drawn at random"
    sizes = [(side, [one for one in results if one.side == side], _disjoint(logs, side)) for side in SIDES]
    promises = [promise for side, of_side, apart in sizes for promise in _promises(side, of_side, apart)]
    rows = tuple(_row(str(side), of_side, apart) for side, of_side, apart in sizes)
    return [
        goals.block("goals on real logs", OPTIONS, text, promises),
        Block("sham", OPTIONS, text, HEADING, rows),
    ]


def _disjoint(logs: Sequence[Observations], side: int) -> int:
    """Cuts that do not overlap."""
    return sum(len(log) // (2 * side) for log in logs)


def _promises(side: int, results: Sequence[Claims], disjoint: int) -> list[Promise]:
    at = f"sham changes, {side} tanks a side"
    return [
        Promise(f"{at}: {what}", goals.FALSE_ALARMS, {ALL: measured})
        for what, measured in (
            ("called a shift", proportion((one.each_look for one in results), disjoint)),
            ("called a shift, target within reach", proportion((one.within_reach for one in results), disjoint)),
            ("95 % range of a single look leaves out zero", proportion((one.mixture for one in results), disjoint)),
        )
    ]


def _row(name: str, results: Sequence[Claims], disjoint: int) -> tuple[str, ...]:
    mixture = proportion((one.mixture for one in results), disjoint)
    each_look = proportion((one.each_look for one in results), disjoint)
    within_reach = proportion((one.within_reach for one in results), disjoint)
    return (
        name,
        f"{len(results)} ({disjoint})",
        rate((one.averages for one in results), disjoint),
        rate((one.regression for one in results), disjoint),
        rate((one.student for one in results), disjoint),
        *_judged(mixture, with_goal=True),
        *_judged(each_look),
        *_judged(within_reach),
        middle((one.standard_error for one in results), 1),
    )


def _judged(measured: Measured | None, *, with_goal: bool = False) -> tuple[str, ...]:
    goal = goals.FALSE_ALARMS
    words = (goal.words,) if with_goal else ()
    return goal.shown(measured), *words, goal.verdict(measured)
