"""Odd entries in the answer: left out, told, and the answer with everything kept beside it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import energytrack as et
from energytrack.inference.results import Assessment
from tests.fitted import Period, fit_parts
from tests.inference.test_several import plain_log
from tests.simulation import SimulatedLog, simulate
from tests.uses import STEADY_COMMUTE

USE = replace(STEADY_COMMUTE, fillings=50)
PLACE = 15


@pytest.fixture(scope="module")
def log() -> SimulatedLog:
    return simulate(USE, np.random.default_rng([2, 5]))


def answer(log: SimulatedLog, entries: pd.DataFrame, **options: object) -> Assessment:
    return et.assess(entries, log.modifications, "part", unit=USE.unit, capacity=USE.capacity, **options)  # type: ignore[arg-type]


def typed_wrong(log: SimulatedLog, factor: float = 2.5) -> pd.DataFrame:
    entries = log.entries.reset_index(drop=True)
    entries.loc[PLACE, "energy"] *= factor
    return entries


def test_nothing_odd_is_told_as_nothing(log: SimulatedLog) -> None:
    clean = answer(log, log.entries)
    assert clean.set_aside == ()
    assert clean.verdict_with_all is None
    assert clean == answer(log, log.entries, set_aside="none")


def test_an_odd_entry_is_left_out_and_told(log: SimulatedLog) -> None:
    entries = typed_wrong(log)
    found = answer(log, entries)
    (told,) = found.set_aside
    assert told.odometer_km == entries.loc[PLACE, "odometer_km"]
    assert told.energy == entries.loc[PLACE, "energy"]
    assert told.deviation_sd > 4
    clean = answer(log, log.entries)
    assert found.segments_baseline == clean.segments_baseline - 1
    assert found.shift_percent == pytest.approx(clean.shift_percent, abs=clean.standard_error_percent / 2)
    assert found.to_dict()["set_aside"][0]["date"] == told.date


def test_everything_kept_is_what_keeping_everything_gives(log: SimulatedLog) -> None:
    entries = typed_wrong(log)
    found, kept = answer(log, entries), answer(log, entries, set_aside="none")
    assert kept.set_aside == ()
    other = found.verdict_with_all
    assert other is not None
    assert (other.verdict, other.shift_percent, other.interval_percent) == (
        kept.verdict, kept.shift_percent, kept.interval_percent,
    )  # fmt: skip
    assert kept.standard_error_percent > found.standard_error_percent


def test_a_slip_after_the_fitting_settles_nothing(log: SimulatedLog) -> None:
    """The newest entry is held back until the next one agrees with it, so no look is taken on it."""
    entries = log.entries.reset_index(drop=True)
    fitted = float(log.modifications["fitted_km"].iloc[0])
    place = int((entries["odometer_km"] <= fitted).sum()) + 1
    entries.loc[place, "energy"] *= 0.3
    at = entries.loc[place, "odometer_km"]
    assert at not in [look.odometer_km for look in answer(log, entries).looks]
    assert at in [look.odometer_km for look in answer(log, entries, set_aside="none").looks]


def test_a_genuine_shift_is_held_back_for_one_look_only() -> None:
    large = simulate(replace(USE, shift_percent=-31.0), np.random.default_rng([2, 5]))
    found, kept = answer(large, large.entries), answer(large, large.entries, set_aside="none")
    assert found.set_aside == ()
    assert len(found.looks) >= len(kept.looks) - 1
    assert found.shift_percent == pytest.approx(kept.shift_percent)
    assert found.verdict == "shifted"


def test_a_single_look_sets_aside_too(log: SimulatedLog) -> None:
    assert len(answer(log, typed_wrong(log), every_look=False).set_aside) == 1


def test_digits_are_those_that_were_typed(log: SimulatedLog) -> None:
    """41 litres typed in a log of US gallons: the suggestion is in gallons."""
    told = answer(log, typed_wrong(log, 3.785), typed_in=("mi", "gal-us")).set_aside[0]
    assert told.suspicion == "litres typed for gallons" or "gal (US)" in told.suggestion


def test_levels_and_variants_are_not_spoilt_by_a_slip() -> None:
    log = plain_log(2)
    entries, parts = fit_parts(log, [Period("wing", 30, 60, -0.03, 5.0), Period("wing", 60, 119, -0.05, 10.0)])
    dams = parts.assign(name=["short", "long"], level=None)
    slip = entries.copy()
    slip.loc[70, "energy"] /= 10
    clean, odd = (et.respond(table, parts, "wing", capacity=75.0).levels[-1] for table in (entries, slip))
    assert odd.shift_percent == pytest.approx(clean.shift_percent, abs=0.5)
    kept = et.respond(slip, parts, "wing", capacity=75.0, set_aside="none").levels[-1]
    widths = [level.interval_percent[1] - level.interval_percent[0] for level in (clean, odd, kept)]
    assert widths[1] < 1.5 * widths[0] < 5 * widths[0] < widths[2]
    whole, compared = (et.compare(table, dams, capacity=75.0) for table in (entries, slip))
    assert [pair.differs for pair in compared.pairs] == [pair.differs for pair in whole.pairs]
    assert compared.warnings == ("1 odd entry set aside; energytrack enough says which, --keep-all keeps them in",)
