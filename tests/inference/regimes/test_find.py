"""From a logbook to breaks: what is found and said of it, and what is asked for where nothing can be looked for."""

from __future__ import annotations

import datetime as dt
from dataclasses import fields, replace

import numpy as np
import pandas as pd
import pytest

import energytrack
from energytrack.consumption.frames import observe_frames
from energytrack.errors import InferenceError
from energytrack.inference.regimes.breaks import find_breaks
from energytrack.inference.regimes.explain import CAUTION
from energytrack.inference.regimes.find import find_regimes
from energytrack.inference.regimes.results import RegimeReport
from tests.simulation import SimulatedLog, long_log, simulate
from tests.uses import DELIVERY_VAN, ELECTRIC, STEADY_COMMUTE, USES, Use


def a_log(use: Use, shift: float, switches: tuple[float, ...], seed: int) -> SimulatedLog:
    return simulate(replace(use, shift_percent=shift, switches=switches), np.random.default_rng(seed))


def regimes(log: SimulatedLog, **options: object) -> RegimeReport:
    use = log.truth.use
    return find_regimes(log.entries, unit=use.unit, capacity=use.capacity, **options)  # type: ignore[arg-type]


@pytest.fixture(scope="module")
def risen() -> SimulatedLog:
    """A commute whose consumption rises by 5 % after six tenths of the log."""
    return a_log(STEADY_COMMUTE, 5.0, (0.6,), seed=4)


@pytest.fixture(scope="module")
def unexplained(risen: SimulatedLog) -> RegimeReport:
    return regimes(risen)


def test_a_rise_is_found_dated_and_sized(risen: SimulatedLog, unexplained: RegimeReport) -> None:
    (found,) = unexplained.breaks
    row = risen.modifications.iloc[0]
    assert found.interval_km[0] < row["fitted_km"] < found.interval_km[1]
    assert found.interval_km[0] < found.odometer_km < found.interval_km[1]
    assert found.interval_dates[0] < row["fitted_date"].date().isoformat() < found.interval_dates[1]
    assert found.interval_percent is not None
    assert found.interval_percent[0] < 5.0 < found.interval_percent[1]
    assert found.p_value == unexplained.p_value < 0.05


def test_consumption_of_every_regime_at_reference_conditions(risen: SimulatedLog, unexplained: RegimeReport) -> None:
    before, after = unexplained.regimes
    assert before.interval[0] < risen.truth.b0 < before.interval[1]
    assert after.interval[0] < 1.05 * risen.truth.b0 < after.interval[1]
    assert after.consumption / before.consumption - 1 == pytest.approx(unexplained.breaks[0].shift_percent / 100)
    assert before.end_km == after.start_km == unexplained.breaks[0].odometer_km
    assert before.segments + after.segments == len(unexplained.points)


def test_points_lie_around_their_regime(unexplained: RegimeReport) -> None:
    for regime in unexplained.regimes:
        inside = [p.consumption for p in unexplained.points if regime.start_km <= p.start_km < regime.end_km]
        assert np.mean(inside) == pytest.approx(regime.consumption, rel=0.015)


def test_an_unexplained_rise_names_places_to_look_and_asks_for_an_inspection(unexplained: RegimeReport) -> None:
    (found,) = unexplained.breaks
    assert found.explained_by is None
    assert found.explanation.startswith("unexplained: nothing was logged from ")
    assert any("tyres" in place for place in found.suspects)
    assert found.caution == CAUTION


def test_a_declared_modification_explains_it(risen: SimulatedLog) -> None:
    (found,) = regimes(risen, modifications=risen.modifications).breaks
    assert (found.explained_by, found.suspects, found.caution) == ("part", (), None)
    km = risen.modifications["fitted_km"].iloc[0]
    assert f"part fitted at {km:,.0f} km, inside the break's range " in found.explanation
    assert found.explanation.endswith("agrees")


def test_an_event_explains_it_by_its_date(risen: SimulatedLog) -> None:
    day = risen.modifications["fitted_date"].iloc[0]
    events = pd.DataFrame({"vehicle": ["steady-commute"], "date": [day], "what": ["new tyres"]})
    assert regimes(risen, events=events).breaks[0].explained_by == "new tyres"
    long_before = events.assign(date=day - pd.Timedelta(days=300))
    assert regimes(risen, events=long_before).breaks[0].explained_by is None


def test_on_and_off_again_is_found_where_no_single_step_is() -> None:
    log = a_log(ELECTRIC, -9.0, (0.3, 0.7), seed=4)
    found = regimes(log, modifications=log.modifications)
    assert [test.more for test in found.tests[:2]] == [1, 2]
    assert found.tests[0].p_value > 0.05 > found.tests[1].p_value == found.p_value
    assert [one.matches[0].kind for one in found.breaks] == ["fitted", "removed"]
    assert found.breaks[0].shift_percent < 0 < found.breaks[1].shift_percent
    assert found.breaks[1].caution is None


def test_nothing_is_found_in_logs_without_a_change() -> None:
    """One log of each kind; the rate over many is measured apart."""
    found = [regimes(a_log(use, 0.0, (0.6,), seed=6)) for use in USES]
    assert [report.breaks for report in found] == [()] * len(USES)
    assert all(len(report.regimes) == 1 and report.note is None for report in found)


def test_only_what_the_declared_do_not_account_for() -> None:
    log = a_log(DELIVERY_VAN, 5.0, (0.5,), seed=2)
    observed = observe_frames(log.entries, log.modifications, unit="L", capacity=75.0)[0]
    assert len(find_breaks(observed, declared=False).places) == 1
    assert find_breaks(observed, declared=True).places == ()


def test_slopes_may_break_too() -> None:
    """Three coefficients instead of one cost power: a larger step is needed."""
    report = regimes(a_log(STEADY_COMMUTE, 8.0, (0.6,), seed=4), slopes=True)
    assert len(report.breaks) == 1
    assert report.statistic is not None
    assert report.p_value_asymptotic is not None
    assert 0 < report.p_value_asymptotic < 0.05


def test_a_long_log_is_searched_on_a_grid_and_then_near_by() -> None:
    log = long_log(1_500, np.random.default_rng(1))
    (found,) = find_regimes(log.entries, modifications=log.modifications, capacity=50.0).breaks
    assert found.explained_by == "part"
    assert found.interval_km[1] - found.interval_km[0] < 0.05 * log.entries["odometer_km"].iloc[-1]


def test_a_break_inside_a_segment_is_dated_there() -> None:
    """Little noise, a large step a third into a segment: the break lies there to within a tenth of it."""
    rng = np.random.default_rng(5)
    km = 500.0 * np.arange(41)
    energy = 30 * (1 + 0.002 * rng.standard_normal(41))
    energy[21] *= 1 + 0.2 * 2 / 3
    energy[22:] *= 1.2
    start = dt.date(2024, 1, 1)
    days = [start + dt.timedelta(days=7 * k) for k in range(41)]
    entries = pd.DataFrame({"date": days, "odometer_km": km, "energy": energy, "temperature_c": 20.0})
    (found,) = find_regimes(entries, capacity=40.0).breaks
    assert found.odometer_km == pytest.approx(20 * 500 + 500 / 3, abs=60)
    assert found.date == (start + dt.timedelta(days=round(7 * 20 + 7 / 3))).isoformat()


def test_criterion_and_tests_are_both_shown(unexplained: RegimeReport) -> None:
    assert [one.breaks for one in unexplained.criteria] == [0, 1, 2, 3, 4, 5]
    residuals = [one.residual for one in unexplained.criteria]
    assert residuals == sorted(residuals, reverse=True)
    assert min(unexplained.criteria, key=lambda one: one.bic).breaks == 1
    assert unexplained.decided_by == "sequential sup-F tests (BIC agrees)"
    assert [test.breaks for test in unexplained.tests] == [0, 1, 1]


def test_as_a_dict(unexplained: RegimeReport) -> None:
    plain = unexplained.to_dict()
    assert set(plain) == {field.name for field in fields(RegimeReport)}
    assert {"statistic", "p_value", "decided_by", "breaks"} <= set(plain)
    expected = {"odometer_km", "date", "interval_km", "interval_dates", "shift_percent", "interval_percent"}
    assert expected | {"explained_by"} <= set(plain["breaks"][0])


def test_facade() -> None:
    assert energytrack.find_regimes is find_regimes


def test_too_few_segments_are_said_with_the_distance_to_drive(risen: SimulatedLog) -> None:
    report = find_regimes(risen.entries.head(8))
    assert report.note is not None
    assert report.note.startswith("7 segments between known levels are too few")
    assert "5 more fill-ups" in report.note
    assert report.note.endswith(" km")
    assert (report.statistic, report.p_value, report.breaks, report.judged_km) == (None, None, (), None)


@pytest.mark.parametrize("spoilt", [{"missed": True}, {"full": False}, {"energy": np.nan}])
def test_all_void(risen: SimulatedLog, spoilt: dict[str, object]) -> None:
    report = find_regimes(risen.entries.assign(**spoilt))
    assert report.note is not None
    assert "no two known levels in a row" in report.note
    assert "12 segments" in report.note


def test_constant_consumption() -> None:
    km = 500.0 * np.arange(30)
    days = pd.date_range("2024-01-01", periods=30, freq="7D")
    report = find_regimes(pd.DataFrame({"date": days, "odometer_km": km, "energy": 30.0}))
    assert report.note is not None
    assert "the same consumption" in report.note
    assert report.breaks == ()


def test_a_change_too_near_the_end_is_said_to_be_out_of_reach(unexplained: RegimeReport) -> None:
    assert unexplained.judged_km is not None
    assert unexplained.judged_km[1] < unexplained.regimes[-1].end_km
    assert unexplained.later_km is not None
    assert unexplained.later_km == pytest.approx(unexplained.regimes[-1].end_km - unexplained.judged_km[1], rel=0.25)


@pytest.mark.parametrize("count", [13, 14, 20])
def test_as_few_segments_as_are_allowed(risen: SimulatedLog, count: int) -> None:
    for trimming in (0.05, 0.15, 0.45):
        report = find_regimes(risen.entries.head(count), capacity=50.0, trimming=trimming)
        assert report.note is None
        assert report.p_value is not None


@pytest.mark.parametrize("wrong", [{"max_breaks": 0}, {"confidence": 1.0}, {"trimming": 0.5}])
def test_options_outside_their_range_are_refused(risen: SimulatedLog, wrong: dict[str, float]) -> None:
    with pytest.raises(InferenceError, match="0"):
        find_regimes(risen.entries, **wrong)  # type: ignore[arg-type]
