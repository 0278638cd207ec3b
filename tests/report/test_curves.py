"""What is drawn of conditions and looks, against the truth the log was drawn from."""

from __future__ import annotations

import numpy as np
import pytest

from energytrack.inference.report.results import Curve, Dot, MonthReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation.graphics.response import binned
from tests.report.logs import COLD, FITTED_KM

Found = list[tuple[Vehicle, MonthReport]]


def curve(found: Found, condition: str) -> Curve:
    return next(each for each in found[0][1].curves if each.condition == condition)


def test_the_curve_bends_where_the_truth_does(found: Found) -> None:
    own = curve(found, "temperature_c")
    value, fitted, low, high = np.array([(s.value, s.consumption, s.low, s.high) for s in own.steps]).T
    warm = fitted[(value >= 18) & (value <= 22)]
    assert np.ptp(warm) < 1e-9 * warm[0], "nothing is heated or cooled there"
    cold = value < 18
    slope = np.polyfit(value[cold], fitted[cold], 1)[0]
    assert slope == pytest.approx(-0.08 * COLD, rel=0.2)
    assert np.all((low < fitted) & (fitted < high))


def test_speed_that_was_put_in_comes_out(found: Found) -> None:
    own = curve(found, "speed_kmh")
    first, last = own.steps[0], own.steps[-1]
    slope = (last.consumption - first.consumption) / (last.value - first.value)
    usual = (last.consumption + first.consumption) / 2
    assert slope / usual == pytest.approx(0.004, abs=0.0015)


def test_dots_scatter_about_the_curve_as_the_log_was_drawn(found: Found) -> None:
    """1 % from trip to trip; the part that saves 8 % is taken out, so that both halves lie on one curve."""
    own = curve(found, "temperature_c")
    at = np.interp([d.value for d in own.dots], [s.value for s in own.steps], [s.consumption for s in own.steps])
    off = np.array([d.consumption for d in own.dots]) / at - 1
    assert 0.005 < off.std() < 0.02
    assert abs(off[:25].mean() - off[-25:].mean()) < 0.015
    assert own.filled_in == 8, "values that were not logged are no dots"
    assert len(own.dots) + own.filled_in == 74


def test_distance_at_each_look_ends_at_the_answers_own(found: Found) -> None:
    tried = found[0][1].tried[0]
    assert len(tried.driven_km) == len(tried.answer.looks)
    assert list(tried.driven_km) == [look.odometer_km - FITTED_KM for look in tried.answer.looks]
    assert tried.driven_km[-1] == tried.answer.distance_modified_km


def test_many_dots_become_means_by_distance() -> None:
    dots = tuple(Dot(k / 1000, 0.08 + 0.01 * (k % 2), 1.0 + 2.0 * (k % 2)) for k in range(1000))
    few = binned(dots, 50)
    assert len(few) == 50
    assert sum(dot.distance_km for dot in few) == pytest.approx(2000)
    assert all(dot.consumption == pytest.approx(0.0875, abs=2e-4) for dot in few), "three quarters weigh 0.09"
    assert binned(dots[:50], 50) == list(dots[:50])
