"""Shares of fitted distance, worked by hand."""

from __future__ import annotations

import pytest

from energytrack.consumption.segments import close_segments
from energytrack.consumption.shares import fitted_position, fitted_shares, highest_levels, shares
from energytrack.errors import ConsumptionError
from energytrack.logbook.records import Modification
from tests.consumption.logs import day, fill, fitted, tyres

LOG = close_segments([fill(10 * n, 1000 + 500 * n, 40) for n in range(5)])  # 1000, 1500, 2000, 2500, 3000 km


def test_fitted_in_mid_tank():
    assert shares(LOG, [fitted(1600)]) == pytest.approx([0, 0.8, 1, 1])


def test_taken_off_in_the_same_tank():
    assert shares(LOG, [fitted(1600, 1700)]) == pytest.approx([0, 0.2, 0, 0])


def test_on_off_on_within_one_tank_and_beyond():
    assert shares(LOG, [fitted(2400), fitted(1100, 1200), fitted(1300, 2100)]) == pytest.approx([0.6, 1, 0.4, 1])


def test_level_multiplies():
    assert shares(LOG, [fitted(1600, 2000, level=2.5), fitted(2000, level=-1)]) == pytest.approx([0, 2.0, -1, -1])


def test_fitted_is_fitted_at_any_level_but_none():
    rows = [fitted(1600, 2000, level=2.5), fitted(2000, 2500, level=-1), fitted(2500, level=0)]
    assert fitted_shares(LOG, rows) == pytest.approx([0, 0.8, 1, 0])


def test_highest_level_is_that_driven_with_so_far():
    rows = [fitted(100, 200, level=9), fitted(1600, 2000), fitted(2000, 2500, level=-2.5), fitted(2500, level=2)]
    assert highest_levels(LOG, rows) == [0, 1, 2.5, 2.5]


def test_a_level_never_driven_with_is_no_level():
    assert highest_levels(LOG, [fitted(1600, 1600, level=9), fitted(3000, level=5)]) == [0, 0, 0, 0]


def test_km_takes_precedence_over_the_date():
    assert shares(LOG, [fitted(2000, fitted_date=day(0))]) == [0, 0, 1, 1]


def test_date_of_an_entry_means_right_after_it():
    assert shares(LOG, [fitted(fitted_date=day(10), removed_date=day(30))]) == [0, 1, 1, 0]


def test_date_between_entries_is_interpolated():
    assert fitted_position(LOG, day(14), None) == pytest.approx(1700)
    assert shares(LOG, [fitted(fitted_date=day(14))]) == pytest.approx([0, 0.6, 1, 1])


def test_dates_outside_the_log_are_its_ends():
    assert shares(LOG, [fitted(fitted_date=day(-50))]) == [1, 1, 1, 1]
    assert shares(LOG, [fitted(fitted_date=day(90))]) == [0, 0, 0, 0]


def test_never_fitted_is_nothing():
    assert shares(LOG, []) == [0, 0, 0, 0]
    assert fitted_position(LOG, None, None) is None


def test_distances_without_an_odometer_are_the_scale():
    log = close_segments([fill(n, None, 40, distance_km=500) for n in range(3)])  # at 500, 1000, 1500
    assert shares(log, [fitted(1100)]) == pytest.approx([0, 0.8])


def test_share_is_of_true_distance():
    # 200 odometer km before the tyres, 300 x 1.1 after them; fitted with the tyres.
    log = close_segments([fill(0, 1000, 30), fill(10, 1500, 40)], [tyres(1.1, 1200)])
    assert shares(log, [fitted(1200)]) == pytest.approx([330 / 530])


@pytest.mark.parametrize(
    ("rows", "says"),
    [
        ([fitted()], "neither a fitting date nor km"),
        ([fitted(2000, 1500)], "before it is fitted"),
        ([fitted(1000, 2000), fitted(1900)], "still on"),
        ([fitted(1000), fitted(1900)], "still on"),
    ],
)
def test_contradictions_are_refused(rows: list[Modification], says: str):
    with pytest.raises(ConsumptionError, match=says):
        shares(LOG, rows)
