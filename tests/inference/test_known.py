"""Known changes: seen, seen otherwise, not seen yet."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import energytrack as et
from energytrack.errors import ConsumptionError
from energytrack.inference.known import known_change
from energytrack.inference.results import KnownChange, Range, Verdict
from energytrack.presentation.advice import next_steps
from tests.presentation.samples import NOT_YET
from tests.simulation import simulate
from tests.uses import DELIVERY_VAN


@pytest.mark.parametrize(
    ("verdict", "shift", "span", "seen"),
    [
        ("shifted", 6.0, (3.0, 9.0), "seen"),
        ("shifted", 2.9, (1.5, 4.3), "seen"),
        ("shifted", 2.0, (1.0, 3.0), "seen-otherwise"),  # less than expected
        ("shifted", 15.0, (11.0, 19.0), "seen-otherwise"),
        ("shifted", -6.0, (-9.0, -3.0), "seen-otherwise"),
        ("shifted", -0.5, (-7.0, 6.0), "seen-otherwise"),  # settled long ago; its sign has turned since
        ("not-yet", 6.0, (-1.0, 13.0), "not-seen-yet"),
        ("no-shift-of-target-size", 0.5, (-2.0, 3.0), "not-seen-yet"),
        ("no-baseline", None, None, "not-seen-yet"),
    ],
)
def test_what_counts_as_seen(verdict: Verdict, shift: float | None, span: Range | None, seen: KnownChange) -> None:
    answer = replace(NOT_YET, verdict=verdict, shift_percent=shift, interval_percent=span)
    assert known_change(answer, (4.0, 9.0)) == seen
    mirrored = None if span is None else (-span[1], -span[0])
    saving = replace(answer, shift_percent=None if shift is None else -shift, interval_percent=mirrored)
    assert known_change(saving, (-9.0, -4.0)) == seen


def asked(shift: float, **columns: object) -> et.Assessment:
    log = simulate(replace(DELIVERY_VAN, shift_percent=shift), np.random.default_rng(4))
    return et.assess(log.entries, log.modifications.assign(**columns), "part", capacity=75.0, every_look=False)


def test_a_known_change_of_the_table_is_seen_in_a_log() -> None:
    answer = asked(9.0, known_low_percent=6.0, known_high_percent=12.0)
    assert answer.known_percent == (6.0, 12.0)
    assert answer.known_change == "seen"
    assert answer.known_change_logged
    assert answer.to_dict()["known_percent"] == [6.0, 12.0]


def test_what_is_off_already_is_not_to_be_taken_off() -> None:
    known = {"known_low_percent": 6.0, "known_high_percent": 12.0}
    on = asked(9.0, **known)
    assert on.fitted_now
    assert any("take it off when parked" in step for step in next_steps(on, "km"))
    last = simulate(DELIVERY_VAN, np.random.default_rng(4)).entries["odometer_km"].iloc[-1]
    off = asked(9.0, **known, removed_km=last)  # right at the last entry
    assert (off.known_change, off.fitted_now) == ("seen", False)
    assert any("not fitted now" in warning for warning in off.warnings)
    assert not any("take it off" in step for step in next_steps(off, "km"))


def test_a_pressure_back_at_its_first_level_counts_as_off() -> None:
    log = simulate(replace(DELIVERY_VAN, shift_percent=0.0, fillings=40), np.random.default_rng(4))
    ends = log.entries["odometer_km"].iloc[[0, 15, 30]].tolist()
    levels = {"name": "pressure", "fitted_km": ends, "removed_km": [*ends[1:], np.nan], "level": [2.4, 2.7, 2.4]}
    for rows, on in ((pd.DataFrame(levels), False), (pd.DataFrame(levels).assign(level=[2.4, 2.4, 2.7]), True)):
        answer = et.assess(log.entries, rows, "pressure", capacity=75.0, every_look=False)
        assert answer.fitted_now == on


def test_the_other_way_round_is_not_as_expected() -> None:
    assert asked(9.0, known_low_percent=-12.0, known_high_percent=-6.0).known_change == "seen-otherwise"


def test_an_ordinary_modification_expects_nothing() -> None:
    answer = asked(9.0)
    assert (answer.known_percent, answer.known_change, answer.known_change_logged) == (None, None, False)


def test_a_known_change_of_another_part_was_logged() -> None:
    log = simulate(replace(DELIVERY_VAN, shift_percent=0.0), np.random.default_rng(4))
    windows = log.modifications.assign(
        name="windows", fitted_km=log.entries["odometer_km"].iloc[20], known_low_percent=4, known_high_percent=9,
        fitted_date=pd.NaT, removed_km=log.entries["odometer_km"].iloc[30],
    )  # fmt: skip
    both = pd.concat([log.modifications, windows], ignore_index=True)
    answer = et.assess(log.entries, both, "part", capacity=75.0, every_look=False)
    assert (answer.known_change, answer.known_change_logged) == (None, True)


def test_a_known_change_that_may_be_none_is_refused() -> None:
    with pytest.raises(ConsumptionError, match="may be none at all"):
        asked(9.0, known_low_percent=-4.0, known_high_percent=9.0)
