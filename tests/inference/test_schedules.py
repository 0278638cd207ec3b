"""When the modification is on: by fill-ups and by date."""

from __future__ import annotations

import numpy as np
import pytest

from energytrack.inference.schedules import alternating, from_day, off_first, on_off_on, weekly


def test_by_week_is_every_fill_up_where_a_fill_up_is_a_week() -> None:
    ends = 7.0 * np.arange(1, 20)
    np.testing.assert_allclose(weekly(ends), alternating(1)(ends))


def test_by_week_is_every_second_fill_up_where_two_make_a_week() -> None:
    ends = 3.5 * np.arange(1, 40)
    np.testing.assert_allclose(weekly(ends), alternating(2)(ends))


def test_a_segment_that_spans_a_swap_gets_its_share() -> None:
    np.testing.assert_allclose(weekly(np.array([5.0, 10.0, 15.0, 28.0])), [1.0, 0.4, 0.2, 6 / 13])
    np.testing.assert_allclose(from_day(12.0)(np.array([5.0, 10.0, 15.0, 28.0])), [0.0, 0.0, 0.6, 1.0])


def test_days_on_by_week_are_half_of_all_days() -> None:
    days = np.random.default_rng(3).uniform(0.2, 9.0, 500)
    ends = np.cumsum(days)
    assert weekly(ends) @ days == pytest.approx(ends[-1] / 2, abs=7.0)


def test_by_fill_ups() -> None:
    ends = np.arange(1.0, 8.0)
    np.testing.assert_array_equal(off_first(2)(ends), [0, 0, 1, 1, 1, 1, 1])
    np.testing.assert_array_equal(on_off_on(2, 3)(ends), [1, 1, 0, 0, 0, 1, 1])
    np.testing.assert_array_equal(alternating(2)(ends), [1, 1, 0, 0, 1, 1, 0])
