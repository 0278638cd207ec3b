"""Segments as arrays: conditions weighted by distance, weather, shares and heads."""

from __future__ import annotations

import math

import numpy as np
import pytest

from energytrack.consumption.observations import observe
from energytrack.consumption.segments import close_segments
from energytrack.errors import UnknownNameError
from energytrack.logbook.records import Modification, Weather
from tests.consumption.logs import day, fill, fitted

ENTRIES = [
    fill(0, 1000, 40, temperature_c=-30, extra={"rain": 9.0}),
    fill(4, 1300, 10, full=False, temperature_c=10, speed_kmh=50, extra={"rain": 0.2}),
    fill(8, 1400, 38, temperature_c=20, extra={"rain": 0.6}),
    fill(10, 2000, 41, speed_kmh=0),
]


def test_conditions_are_weighted_by_the_distance_driven_in_them():
    observed = observe(close_segments(ENTRIES), covariates=["rain"])
    assert observed.conditions["temperature_c"] == pytest.approx([(300 * 10 + 100 * 20) / 400, math.nan], nan_ok=True)
    assert observed.conditions["rain"] == pytest.approx([(300 * 0.2 + 100 * 0.6) / 400, math.nan], nan_ok=True)
    assert observed.known_share["temperature_c"].tolist() == [1, 0]


def test_condition_known_on_most_of_the_distance_stands_for_all_of_it():
    observed = observe(close_segments(ENTRIES))
    assert observed.conditions["speed_kmh"][0] == 50
    assert observed.known_share["speed_kmh"].tolist() == [0.75, 0]


def test_condition_known_on_little_of_the_distance_is_unknown():
    entries = [fill(0, 1000, 40), fill(4, 1300, 10, full=False), fill(8, 1400, 38, temperature_c=20)]
    observed = observe(close_segments(entries))
    assert math.isnan(observed.conditions["temperature_c"][0])
    assert observed.known_share["temperature_c"][0] == 0.25


def test_weather_fills_in_the_mean_of_the_days_since_the_entry_before():
    weather = [Weather(day(n), float(n)) for n in (12, 7, 8, 9, 10)]
    observed = observe(close_segments(ENTRIES), weather=weather)
    assert observed.conditions["temperature_c"] == pytest.approx([12.5, 9.0])  # days 8, 9 and 10


def test_weather_that_knows_no_day_of_it_leaves_it_unknown():
    observed = observe(close_segments(ENTRIES), weather=[Weather(day(50), 3.0)])
    assert math.isnan(observed.conditions["temperature_c"][1])


def test_arrays_line_up_with_the_segments():
    log = close_segments(ENTRIES, capacity=60, unit="L")
    other = Modification("van", "cover", fitted_km=1000, level=2.0)
    observed = observe(log, [fitted(1700), other])
    assert len(observed) == 2
    assert observed.distance_km.tolist() == [400, 600]
    assert observed.energy.tolist() == [48, 41]
    assert observed.start_km.tolist() == [1000, 1400]
    assert observed.end_km.tolist() == [1400, 2000]
    assert observed.mid_day.tolist() == [day(4).toordinal(), day(9).toordinal()]
    assert observed.end_day.tolist() == [day(8).toordinal(), day(10).toordinal()]
    assert observed.linked.tolist() == [False, True]
    assert observed.names == ("skirts", "cover")
    assert observed.shares == pytest.approx(np.array([[0, 2], [0.5, 2]]))
    assert (observed.unit, observed.capacity) == ("L", 60)


def test_head_is_what_was_known_then_and_shares_memory():
    observed = observe(close_segments(ENTRIES), [fitted(1700)])
    head = observed.head(1)
    assert len(head) == 1
    assert head.shares.shape == (1, 1)
    assert head.conditions["temperature_c"].tolist() == [12.5]
    assert np.shares_memory(head.energy, observed.energy)


def test_empty_log_has_empty_arrays():
    observed = observe(close_segments([]), [fitted(1700)])
    assert len(observed) == 0
    assert observed.shares.shape == (0, 1)
    assert observed.conditions["temperature_c"].shape == (0,)


def test_covariate_that_no_entry_has_is_refused_with_those_that_exist():
    with pytest.raises(UnknownNameError, match=r"payload.*rain"):
        observe(close_segments(ENTRIES), covariates=["payload"])


def test_modifications_can_be_left_out_and_added():
    log = observe(close_segments(ENTRIES), [fitted(1_200, level=4.0)])
    assert len(log) == 2
    assert log.keeping(()).shares.shape == (len(log), 0)
    pretended = log.adding("pretended", np.array([0.0, 0.5]))
    assert pretended.names == (*log.names, "pretended")
    assert pretended.levels[:, 1].tolist() == [0.0, 1.0]
    again = pretended.keeping(log.names)
    for table in ("shares", "fitted", "levels"):
        np.testing.assert_array_equal(getattr(again, table), getattr(log, table))
