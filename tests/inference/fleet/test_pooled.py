"""Shifts pooled over a fleet: what it says and how far there is to go."""

from __future__ import annotations

import numpy as np
import pytest

from energytrack.errors import InferenceError
from energytrack.inference.fleet.pooled import information_wanted, pooled_shifts
from energytrack.inference.fleet.random_effects import pool
from energytrack.inference.fleet.results import BriefAnswer, Milestone, VehicleReview


def vehicle(name: str, shift: float, error: float, *, never_apart: tuple[str, ...] = (), pace: float = 100.0):
    """A vehicle whose information grows in proportion to distance, and doubles in 10,000 km."""
    now = (error / 100) ** 2
    ahead = tuple(Milestone(km, km / pace, now / (1 + km / 10_000)) for km in np.linspace(0, 100_000, 21).tolist())
    figures = (3.0, shift, None, error, 20.0, 0.5, 5000.0, 1000.0, 10.0)
    answer = BriefAnswer("part", "not-yet", *figures, never_apart=never_apart, ahead=ahead)
    return VehicleReview(name, "L", answers=(answer,))


def pooled(*vehicles):
    (found,) = pooled_shifts(vehicles, confidence=0.95, power=0.80)
    return found


def test_vehicles_that_agree_are_as_sure_as_their_own_errors_allow_and_no_more() -> None:
    found = pooled(*(vehicle(str(k), -2.0, 1.0) for k in range(4)))
    assert found.shift_percent == pytest.approx(-2.0)
    assert found.standard_error_percent == pytest.approx(0.5)  # 1 / sqrt(4), not the 0 of four equal shifts
    assert found.heterogeneity.between_percent == 0
    assert found.interval_percent == pytest.approx((-2 - 3.182446 * 0.5, -2 + 3.182446 * 0.5))  # Student's tables
    assert found.next_vehicle_percent == pytest.approx((-2 - 4.302653 * 0.5, -2 + 4.302653 * 0.5))


def test_distance_is_where_the_information_suffices() -> None:
    vehicles = [vehicle(str(k), -2.0, 1.5) for k in range(4)]
    found = pooled(*vehicles)
    wanted = information_wanted(0.03, 4, 0.95, 0.80)
    now = 4 / 0.015**2
    assert found.information_fraction == pytest.approx(now / wanted)
    assert found.distance_to_go_km == pytest.approx(4 * 10_000 * (wanted / now - 1), rel=1e-6)
    assert found.days_to_go == pytest.approx(found.distance_to_go_km / 4 / 100)
    assert information_wanted(0.03, 10_000, 0.95, 0.80) == pytest.approx((2.8016 / 0.03) ** 2, rel=1e-3)  # method, 4


def test_the_one_that_brings_most_comes_first() -> None:
    found = pooled(vehicle("vague", -2.0, 3.0), vehicle("sharp", -2.1, 1.0), vehicle("middling", -1.9, 2.0))
    assert [each.vehicle for each in found.vehicles] == ["sharp", "middling", "vague"]
    assert sum(each.weight_percent for each in found.vehicles) == pytest.approx(100)
    total = sum(1 / each**2 for each in (3.0, 1.0, 2.0))
    assert found.vehicles[0].gain_percent == pytest.approx(100 * 0.1 / total)  # a tenth of its own, by 1,000 km


def test_vehicles_that_differ_need_more_vehicles_and_not_more_distance() -> None:
    found = pooled(*(vehicle(str(k), shift, 0.3) for k, shift in enumerate((-9.0, -3.0, 2.0))))
    assert found.heterogeneity.between_percent == pytest.approx(np.std([-9, -3, 2], ddof=1), rel=0.05)
    assert found.distance_to_go_km is None
    assert found.vehicles_needed > 20


def test_answers_for_several_parts_at_once_are_not_pooled() -> None:
    others = [vehicle("a", -2.0, 1.0), vehicle("b", -2.0, 1.0, never_apart=("wing",))]
    assert pooled_shifts(others, confidence=0.95, power=0.80) == ()
    with pytest.raises(InferenceError, match="at least two"):
        pool([1.0], [1.0])
    with pytest.raises(InferenceError, match="above 0"):
        pool([1.0, 2.0], [1.0, 0.0])
