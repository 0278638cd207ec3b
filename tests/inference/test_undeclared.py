"""A change nobody declared stands against a verdict; one that was declared does not."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pandas as pd

from energytrack.inference.assess import assess
from energytrack.inference.results import Assessment
from energytrack.presentation.enough import render
from tests.simulation import SimulatedLog, simulate
from tests.uses import STEADY_COMMUTE

ENTRIES, CHANGED_AFTER = 110, 68  # the part is fitted half-way, at entry 55


def log(seed: int, shift_percent: float = 0.0) -> SimulatedLog:
    return simulate(replace(STEADY_COMMUTE, fillings=ENTRIES, shift_percent=shift_percent), np.random.default_rng(seed))


def changed(drawn: SimulatedLog, after: int = CHANGED_AFTER, by: float = 0.90) -> tuple[pd.DataFrame, float]:
    """The entries with another consumption from one of them on, and its odometer value."""
    entries = drawn.entries.copy()
    at = float(entries["odometer_km"].iloc[after])
    entries.loc[entries["odometer_km"] > at, "energy"] *= by
    return entries, at


@cache
def without_event(seed: int) -> Assessment:
    drawn = log(seed)
    return assess(changed(drawn)[0], drawn.modifications, "part", capacity=50.0)


def with_event(seed: int) -> Assessment:
    drawn = log(seed)
    entries, at = changed(drawn)
    day = entries.loc[entries["odometer_km"] == at, "date"].iloc[0]
    events = pd.DataFrame([{"vehicle": "", "date": day, "odometer_km": at, "what": "another route"}])
    return assess(entries, drawn.modifications, "part", capacity=50.0, events=events.assign(vehicle=_vehicle(entries)))


def _vehicle(entries: pd.DataFrame) -> str:
    return str(entries["vehicle"].iloc[0])


def test_an_unexplained_change_inside_the_test_withholds_a_shift() -> None:
    answer = without_event(3)
    _, at = changed(log(3))
    (against,) = answer.undeclared
    assert answer.withheld
    assert answer.verdict == "not-yet"
    assert answer.settled_at_km is None
    assert against.interval_km[0] <= at <= against.interval_km[1]
    assert against.interval_percent is not None
    assert against.interval_percent[0] < -10 < against.interval_percent[1]
    said = "\n".join(line.plain for line in render(answer))
    assert said.startswith("Not yet, though a shift was found: consumption also changed by -9.7 % at about")
    assert 'energytrack event "WHAT HAPPENED" 50321' in said


def test_without_the_search_those_logs_would_have_been_called_shifted() -> None:
    drawn = [without_event(seed) for seed in (3, 6, 8)]
    assert all(answer.withheld for answer in drawn)
    assert all(abs(answer.shift_percent or 0) > 5 for answer in drawn)


def test_an_event_there_resolves_it_and_the_rest_is_no_shift() -> None:
    answer = with_event(3)
    assert not answer.withheld
    assert answer.undeclared == ()
    assert any("at another route" in warning for warning in answer.warnings)
    assert answer.verdict != "shifted"
    assert abs(answer.shift_percent or 0) < 3
    assert answer.together is None or "another route" not in [e.modification for e in answer.together.each]


def test_an_event_at_which_nothing_changed_costs_nothing() -> None:
    drawn = log(5, shift_percent=-6.0)
    day, at = drawn.entries["date"].iloc[30], drawn.entries["odometer_km"].iloc[30]
    events = pd.DataFrame(
        [{"vehicle": _vehicle(drawn.entries), "date": day, "odometer_km": at, "what": "washed"}]
    )
    plain = assess(drawn.entries, drawn.modifications, "part", capacity=50.0)
    noted = assess(drawn.entries, drawn.modifications, "part", capacity=50.0, events=events)
    assert noted.shift_percent == plain.shift_percent
    assert noted.looks == plain.looks


def test_a_change_after_the_verdict_is_told_and_does_not_undo_it() -> None:
    drawn = log(5, shift_percent=-9.0)
    settled = assess(drawn.entries, drawn.modifications, "part", capacity=50.0)
    entries, at = changed(drawn, after=92, by=1.12)
    answer = assess(entries, drawn.modifications, "part", capacity=50.0)
    assert settled.settled_at_km is not None
    assert settled.settled_at_km < at
    assert answer.verdict == settled.verdict == "shifted"
    assert [round(found.shift_percent / 4) for found in answer.undeclared] == [3]
    assert answer.undeclared[0].caution is not None  # a sudden rise


def test_a_blind_search_may_agree_with_the_modification() -> None:
    drawn = log(5, shift_percent=-9.0)
    answer = assess(drawn.entries, drawn.modifications, "part", capacity=50.0)
    assert answer.agreeing is not None
    assert answer.agreeing.explained_by == "part"
    said = "\n".join(line.plain for line in render(answer))
    assert "A search blind to it finds the change there as well, between" in said.replace("\n", " ")
