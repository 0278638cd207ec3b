"""Graded parts: the line or parabola that was put in is found, with the level of least consumption."""

from __future__ import annotations

import pytest

from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference.response import respond
from tests.fitted import Period, fit_parts
from tests.inference.test_several import plain_log


def parabola(level: float) -> float:
    """Least consumption, 8 % less, at level 10."""
    return 0.0008 * (level - 10) ** 2 - 0.08


def parabola0(level: float) -> float:
    """The same, and exactly nothing at level 0."""
    return parabola(level) if level else 0.0


def wing(levels: tuple[float, ...], effect, seed: int = 6):  # type: ignore[no-untyped-def]
    step = 100 // len(levels)
    periods = [
        Period("wing", 19 + k * step, 19 + (k + 1) * step if k < len(levels) - 1 else 119, effect(level), level)
        for k, level in enumerate(levels)
    ]
    return fit_parts(plain_log(seed), periods)


def test_a_line_through_two_levels() -> None:
    entries, parts = wing((5.0,), lambda level: -0.012 * level)
    found = respond(entries, parts, "wing", capacity=75.0)
    assert found.form == "line"
    assert found.reference_level == 0.0
    assert found.per_level.shift_percent == pytest.approx(-1.2, abs=0.25)
    assert found.best_level is None
    assert found.next_level == 10.0


def test_the_level_of_least_consumption() -> None:
    entries, parts = wing((5.0, 16.0, 20.0), parabola)
    found = respond(entries, parts, "wing", capacity=75.0)
    assert found.form == "parabola"
    low, high = found.best_level_interval
    assert low < 10 < high
    assert found.best_level == pytest.approx(10.0, abs=1.5)
    assert found.next_level == found.best_level
    by_level = {effect.level: effect for effect in found.levels}
    assert list(by_level) == [0.0, 5.0, 16.0, 20.0]
    for level in (5.0, 16.0):
        truth = 100 * (1 + parabola(level)) - 100
        assert by_level[level].interval_percent[0] < truth < by_level[level].interval_percent[1]


def test_a_best_level_already_driven_leaves_nothing_to_try() -> None:
    entries, parts = wing((5.0, 10.0, 20.0), parabola)
    found = respond(entries, parts, "wing", capacity=75.0)
    assert found.best_level == pytest.approx(10.0, abs=1.5)
    assert found.next_level is None


def test_pressure_has_a_level_from_the_first_day() -> None:
    """Driven at some level always: counted from the lowest one."""
    log = plain_log(7)
    periods = [Period("pressure", 0, 60, 0.0, 2.4), Period("pressure", 60, 119, -0.03, 2.7)]
    entries, parts = fit_parts(log, periods)
    found = respond(entries, parts, "pressure", capacity=75.0)
    assert found.reference_level == 2.4
    assert [effect.level for effect in found.levels] == [2.4, 2.7]
    assert found.levels[1].interval_percent[0] < -3 < found.levels[1].interval_percent[1]


def test_not_fitted_is_no_level() -> None:
    """Consumption without it lies on no curve through the levels: fitted at all, it saves 6 % at level 27."""
    truth = {24.0: -0.03, 27.0: -0.06, 30.0: -0.02}
    entries, parts = wing(tuple(truth), truth.__getitem__)
    found = respond(entries, parts, "wing", capacity=75.0)
    assert (found.form, found.reference_level) == ("parabola", 0.0)
    assert [effect.level for effect in found.levels] == [0.0, *truth]
    for effect in found.levels[1:]:
        assert effect.interval_percent[0] < 100 * truth[effect.level] < effect.interval_percent[1]
        assert effect.shift_percent == pytest.approx(100 * truth[effect.level], abs=1.5)
    assert found.best_level == pytest.approx(26.8, abs=1.0)


def test_two_levels_of_a_part_that_acts_as_such() -> None:
    entries, parts = wing((24.0, 27.0), lambda _: -0.05)
    found = respond(entries, parts, "wing", capacity=75.0)
    assert (found.form, found.best_level) == ("line", None)
    assert found.per_level.interval_percent[0] < 0 < found.per_level.interval_percent[1]
    assert all(e.interval_percent[0] < -5 < e.interval_percent[1] for e in found.levels[1:])
    assert found.next_level in (21.0, 30.0)


def test_a_level_of_0_that_was_logged_lies_on_the_curve() -> None:
    entries, parts = wing((0.0, 5.0, 20.0), parabola0)
    found = respond(entries, parts, "wing", capacity=75.0)
    assert [effect.level for effect in found.levels] == [0.0, 5.0, 20.0]
    assert found.best_level == pytest.approx(10.0, abs=1.5)


def test_what_has_no_levels_is_refused() -> None:
    entries, parts = fit_parts(plain_log(8, 60), [Period("wing", 20, 59, -0.03)])
    with pytest.raises(InferenceError, match="level"):
        respond(entries, parts, "wing", capacity=75.0)
    with pytest.raises(UnknownNameError, match="wing"):
        respond(entries, parts, "flap", capacity=75.0)
