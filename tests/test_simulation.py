"""The simulator keeps its own accounts and has the moments it states."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from tests.simulation import FULL_MARK, SimulatedLog, long_log, ornstein_uhlenbeck, simulate
from tests.uses import ELECTRIC, HOUSEHOLD, PARTIAL_AND_MISSED, SLOPPY_FILLS, STEADY_COMMUTE, TRIP_KM, USES, Use

QUIET = replace(
    STEADY_COMMUTE, trip_percent=0.0, drift_weeks_percent=0.0, drift_seasons_percent=0.0, level_error_percent=0.0
)
FLAT = replace(QUIET, heating=0.0, cooling=0.0, speed_spread=0.0)


def draw(use: Use, seed: int = 1) -> SimulatedLog:
    return simulate(use, np.random.default_rng(seed))


@pytest.mark.parametrize("use", USES, ids=lambda use: use.vehicle)
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_energy_bought_is_energy_used_plus_change_of_level(use: Use, seed: int) -> None:
    truth = draw(use, seed).truth
    fillings = truth.fillings
    change = np.diff(fillings["level"], prepend=truth.level_at_start)
    np.testing.assert_allclose(fillings["bought"], fillings["used"] + change, atol=1e-9)


@pytest.mark.parametrize("use", USES, ids=lambda use: use.vehicle)
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_tank_is_never_empty_nor_far_above_its_capacity(use: Use, seed: int) -> None:
    fillings = draw(use, seed).truth.fillings
    assert (fillings["level"] - fillings["bought"]).min() > 0
    assert fillings["level"].max() < 1.1 * use.capacity


@pytest.mark.parametrize("use", USES, ids=lambda use: use.vehicle)
def test_same_seed_draws_the_same_log(use: Use) -> None:
    pd.testing.assert_frame_equal(draw(use, 7).entries, draw(use, 7).entries)
    assert not draw(use, 7).entries["energy"].equals(draw(use, 8).entries["energy"])


def test_uses_are_seven_and_differ_by_name() -> None:
    assert len({use.vehicle for use in USES}) == len(USES) == 7


def test_forgotten_fillings_are_flagged_on_the_entry_that_follows() -> None:
    log = draw(PARTIAL_AND_MISSED)
    logged = log.truth.fillings["logged"].to_numpy()
    follows = logged & ~np.concatenate([[True], logged[:-1]])
    flagged = log.entries.loc[log.entries["missed"], "odometer_km"]
    assert len(flagged) > 0
    assert flagged.tolist() == log.truth.fillings.loc[follows, "odometer_km"].tolist()
    assert len(log.entries) == logged.sum()


def test_partial_share_is_about_as_stated() -> None:
    partial = np.mean([(~draw(PARTIAL_AND_MISSED, seed).entries["full"]).mean() for seed in range(10)])
    assert partial == pytest.approx(PARTIAL_AND_MISSED.partial_share, abs=0.04)


def test_what_is_not_logged_has_no_column() -> None:
    assert not {"temperature_c", "speed_kmh", "level_percent"} & set(draw(HOUSEHOLD).entries.columns)
    assert draw(ELECTRIC).entries["level_percent"].between(60, 100).sum() > 100


def test_shift_is_a_share_of_consumption_at_mean_conditions() -> None:
    """Conditions are centred over the log: without noise they cancel exactly in the total."""
    log = draw(replace(QUIET, shift_percent=-4.0, switches=(0.4,)))
    truth, fillings = log.truth, log.truth.fillings
    total = fillings["odometer_km"].iloc[-1] - 20_000
    fitted = fillings["odometer_km"].iloc[-1] - log.modifications["fitted_km"].iloc[0]
    assert fillings["used"].sum() == pytest.approx(truth.b0 * (total - 0.04 * fitted), rel=1e-12)


def test_part_taken_off_and_on_again_has_a_row_for_each_time() -> None:
    log = draw(replace(FLAT, shift_percent=-10.0, switches=(0.25, 0.5, 0.75)))
    first, second = log.modifications.itertuples()
    total = log.truth.fillings["odometer_km"].iloc[-1]
    fitted = first.removed_km - first.fitted_km + total - second.fitted_km
    assert pd.isna(second.removed_km)
    expected = log.truth.b0 * (total - 20_000 - 0.1 * fitted)
    assert log.truth.fillings["used"].sum() == pytest.approx(expected, rel=1e-12)


def test_heating_slope_is_the_stated_one() -> None:
    use = replace(QUIET, fillings=300, cooling=0.0, speed_spread=0.0, shift_percent=0.0, temperature_missing_share=0.0)
    entries = draw(use).entries
    cold = entries[entries["temperature_c"] < 12].iloc[1:]
    consumption = cold["energy"] / entries["odometer_km"].diff()[cold.index]
    slope = np.polyfit(18 - cold["temperature_c"], consumption, 1)[0]
    assert 100 * slope / (use.b0 / 100) == pytest.approx(use.heating, rel=0.03)


def test_drag_grows_with_the_square_of_speed() -> None:
    use = replace(QUIET, fillings=300, heating=0.0, cooling=0.0, shift_percent=0.0, accessory_share=0.0)
    entries = draw(use).entries.iloc[1:]
    consumption = entries["energy"] / draw(use).entries["odometer_km"].diff()[1:]
    slope = np.polyfit((entries["speed_kmh"] / use.speed_kmh) ** 2, consumption, 1)[0]
    assert slope / (use.b0 / 100) == pytest.approx(use.drag_share, rel=0.05)  # speeds are logged as whole km/h


def test_trip_noise_of_a_tank_is_that_of_a_trip_over_the_root_of_their_number() -> None:
    use = replace(FLAT, trip_percent=10.0, fillings=4000, shift_percent=0.0)
    truth = draw(use).truth
    km = truth.fillings["odometer_km"].diff()[1:]
    relative = 100 * (truth.fillings["used"][1:] / (truth.b0 * km) - 1)
    standardised = relative * np.sqrt(km / TRIP_KM)
    assert standardised.std() == pytest.approx(10.0, rel=0.04)
    assert relative.std() == pytest.approx(truth.trip_percent_per_fill, rel=0.04)


def test_level_errors_have_the_stated_size_and_are_paid_back() -> None:
    use = replace(FLAT, level_error_percent=SLOPPY_FILLS.level_error_percent, fillings=4000, shift_percent=0.0)
    log = draw(use)
    assert log.truth.fillings["level"].std() == pytest.approx(log.truth.level_error, rel=0.04)
    assert log.truth.fillings["level"].mean() == pytest.approx(FULL_MARK / 100 * use.capacity, abs=0.1)
    error = (log.entries["energy"] - log.truth.fillings["used"]).to_numpy()
    assert np.corrcoef(error[1:], error[:-1])[0, 1] == pytest.approx(-0.5, abs=0.04)


@pytest.mark.parametrize("half_life", [21.0, 180.0])
def test_drift_is_stationary_and_halves_its_correlation_in_a_half_life(half_life: float) -> None:
    rng = np.random.default_rng(5)
    dates = np.array(["2024-01-01"], "datetime64[D]") + np.array([0, 10, 10 + int(half_life)])
    paths = np.array([ornstein_uhlenbeck(dates, half_life, 2.0, rng) for _ in range(4000)])
    np.testing.assert_allclose(paths.std(axis=0), 2.0, rtol=0.05)
    assert np.corrcoef(paths[:, 1], paths[:, 2])[0, 1] == pytest.approx(0.5, abs=0.05)


def test_fitting_in_mid_tank_is_usual() -> None:
    logs = [draw(STEADY_COMMUTE, seed) for seed in range(10)]
    mid = [log.modifications["fitted_km"].iloc[0] not in set(log.entries["odometer_km"]) for log in logs]
    assert sum(mid) >= 5


def test_long_log_keeps_its_accounts_too() -> None:
    log = long_log(2000, np.random.default_rng(3))
    fillings = log.truth.fillings
    change = np.diff(fillings["level"], prepend=log.truth.level_at_start)
    np.testing.assert_allclose(fillings["bought"], fillings["used"] + change, atol=0.0051)
    assert len(log.entries) == 2000
    assert (log.entries["odometer_km"] < log.modifications["fitted_km"].iloc[0]).sum() in (999, 1000)
