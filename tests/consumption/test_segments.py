"""Each rule of closing segments, worked by hand (energy balance: bought less what the level rose by)."""

from __future__ import annotations

import datetime as dt
import math

import pytest

from energytrack.consumption.segments import close_segments
from energytrack.logbook.records import Entry
from tests.consumption.logs import day, fill, tyres


def test_full_to_full_is_one_segment_with_the_amount_bought_at_its_end():
    log = close_segments([fill(0, 1000, 40), fill(5, 1600, 48), fill(9, 2100, 41)])
    assert [(s.distance_km, s.energy, s.linked) for s in log.segments] == [(600, 48, False), (500, 41, True)]
    assert [(s.start_km, s.end_km) for s in log.segments] == [(1000, 1600), (1600, 2100)]
    assert log.segments[1].start_day == day(5).toordinal()
    assert log.segments[1].end_day == day(9).toordinal()
    assert not log.void
    assert not log.open_legs


def test_partial_fill_is_merged_into_the_next_full_one():
    log = close_segments([fill(0, 1000, 40), fill(3, 1300, 10, full=False), fill(5, 1600, 38)])
    (segment,) = log.segments
    assert (segment.distance_km, segment.energy) == (600, 48)
    assert [(leg.distance_km, leg.entry) for leg in segment.legs] == [(300, 1), (300, 2)]


def test_driving_since_the_last_known_level_stays_open():
    log = close_segments([fill(0, 1000, 40), fill(3, 1300, 10, full=False)])
    assert not log.segments
    assert [leg.distance_km for leg in log.open_legs] == [300]
    assert not log.void


def test_reading_takes_precedence_over_full_and_corrects_for_the_level():
    # 60 L tank: full, then 20 L bought ends at half: used 20 + 30 = 50; then filled up with 45: used 45 - 30 = 15.
    entries = [fill(0, 1000, 40), fill(3, 1600, 20, level_percent=50), fill(6, 1800, 45)]
    log = close_segments(entries, capacity=60)
    assert [s.energy for s in log.segments] == pytest.approx([50, 15])
    assert [(s.start_weight, s.end_weight) for s in log.segments] == [(1, 2), (2, 1)]
    assert not log.capacity_is_estimated


def test_state_of_charge_is_known_as_well_as_a_full_charge():
    entries = [fill(0, 0, 30, kind="charge"), fill(1, 200, 10, kind="charge", level_percent=60)]
    log = close_segments(entries, capacity=50, unit="kWh")
    assert log.segments[0].energy == pytest.approx(10 + 0.4 * 50)
    assert log.segments[0].end_weight == 1


def test_missed_entry_voids_the_span_and_cuts_the_link():
    entries = [fill(0, 1000, 40), fill(3, 1500, 40), fill(9, 2600, 45, missed=True), fill(12, 3100, 40)]
    log = close_segments(entries)
    assert [(s.start_km, s.end_km, s.linked) for s in log.segments] == [(1000, 1500, False), (2600, 3100, False)]
    assert [(span.start_km, span.end_km, span.reason) for span in log.void] == [(1500, 2600, "missed entry")]


def test_missed_partial_entry_voids_up_to_the_next_known_level():
    entries = [fill(0, 1000, 40), fill(3, 1500, 10, full=False, missed=True), fill(5, 1700, 40), fill(8, 2200, 41)]
    log = close_segments(entries)
    assert [(s.start_km, s.end_km) for s in log.segments] == [(1700, 2200)]
    assert [(span.start_km, span.end_km) for span in log.void] == [(1000, 1700)]


@pytest.mark.parametrize(
    ("broken", "reason"),
    [
        (fill(3, 1500, math.nan), "no amount"),
        (fill(3, 1500, -4.0), "no amount"),
        (fill(3, 1000, 12), "not driven"),
        (fill(3, 1500, 0.0), "no energy used"),
        (fill(3, None, 40), "no distance"),
    ],
)
def test_what_cannot_be_measured_is_void_with_its_reason(broken, reason):
    log = close_segments([fill(0, 1000, 40), broken, fill(6, 2100, 41)])
    assert log.void[0].reason == reason
    assert all(not segment.linked for segment in log.segments)


def test_unknown_start_level_is_void():
    log = close_segments([fill(0, 1000, 20, full=False), fill(3, 1500, 40), fill(6, 2000, 41)])
    assert [span.reason for span in log.void] == ["no known level"]
    assert len(log.segments) == 1


@pytest.mark.parametrize(
    ("entries", "lacks"),
    [
        ([fill(n, 1000 + 200 * n, 30, full=False) for n in range(6)], True),
        ([fill(0, 1000, 30), fill(1, 1200, 30, full=False)], True),
        ([fill(0, 1000, 30), fill(1, 1200, 30, full=False), fill(2, 1400, 30)], False),
        ([fill(0, 1000, 30), fill(1, 1200, 30, missed=True)], False),  # two are known, yet what was used is not
        ([fill(0, 1000, 30)], False),  # nothing driven yet
        ([], False),
    ],
)
def test_whether_levels_are_what_is_lacking(entries, lacks):
    assert close_segments(entries).lacks_levels == lacks


def test_open_driving_after_a_missed_entry_is_void_and_not_open():
    log = close_segments([fill(0, 1000, 40), fill(3, 1500, 20, full=False, missed=True)])
    assert not log.open_legs
    assert [span.reason for span in log.void] == ["missed entry"]


def test_readings_without_capacity_use_one_estimated_from_the_largest_purchases():
    # 42 L to 70 % means at least 60 L; 5 % above it: nobody arrives empty.
    entries = [fill(0, 1000, 50), fill(3, 1500, 42, level_percent=70), fill(6, 2000, 55)]
    log = close_segments(entries)
    assert log.capacity == pytest.approx(63)
    assert log.capacity_is_estimated
    assert log.segments[0].energy == pytest.approx(42 + 0.3 * 63)


def test_battery_is_not_estimated_where_no_reading_needs_it():
    log = close_segments([fill(0, 0, 30), fill(1, 200, 31)], unit="kWh")
    assert log.capacity is None
    assert not log.capacity_is_estimated


def test_level_outside_0_to_100_is_a_problem_and_unknown():
    log = close_segments([fill(0, 1000, 40), fill(3, 1300, 10, level_percent=140), fill(5, 1600, 38)], capacity=60)
    assert [s.energy for s in log.segments] == [48]
    assert "outside 0 to 100" in log.problems[0].message


def test_log_without_odometer_adds_distances_up_from_0():
    entries = [fill(n, None, 30, distance_km=d) for n, d in enumerate([400, 500, None, 300])]
    log = close_segments(entries)
    assert log.positions == (400, 900, 900, 1200)
    assert [(s.start_km, s.end_km) for s in log.segments] == [(400, 900), (900, 1200)]
    assert [span.reason for span in log.void] == ["no distance"]


def test_odometer_noted_only_later_is_continued_backwards():
    entries = [fill(0, None, 30, distance_km=400), fill(1, None, 30, distance_km=500)]
    entries += [fill(2, 10_300, 30, distance_km=300), fill(3, 10_700, 30, distance_km=401)]
    log = close_segments(entries)
    assert log.positions == (9500, 10_000, 10_300, 10_700)
    assert [s.distance_km for s in log.segments] == [500, 300, 400]


def test_odometer_left_out_once_is_continued_by_the_noted_distance():
    log = close_segments([fill(0, 1000, 30), fill(1, None, 30, distance_km=450), fill(2, 1900, 30)])
    assert log.positions == (1000, 1450, 1900)
    assert [s.distance_km for s in log.segments] == [450, 450]


def test_positions_never_run_backwards_where_noted_distances_overshoot_the_odometer():
    entries = [fill(0, 1000, 30), fill(1, None, 30, distance_km=700), fill(2, 1600, 30, distance_km=50)]
    log = close_segments(entries)
    assert log.positions == (1000, 1600, 1600)
    assert [s.distance_km for s in log.segments] == [700, 50]


def test_odometer_ahead_of_the_noted_distance_means_a_missing_entry():
    log = close_segments([fill(0, 1000, 30), fill(1, 2100, 40, distance_km=520), fill(2, 2600, 30)])
    assert [span.reason for span in log.void] == ["missed entry"]
    assert "an entry seems to be missing" in log.problems[0].message
    assert [s.linked for s in log.segments] == [False]


def test_odometer_behind_the_noted_distance_uses_the_distance_and_says_so():
    log = close_segments([fill(0, 1000, 30), fill(1, 1052, 40, distance_km=520)])
    assert [s.distance_km for s in log.segments] == [520]
    assert "the noted distance is used" in log.problems[0].message


def test_small_disagreement_is_nothing():
    log = close_segments([fill(0, 1000, 30), fill(1, 1520, 40, distance_km=500)])
    assert [s.distance_km for s in log.segments] == [520]
    assert not log.problems


def test_tyres_count_from_their_odometer_inside_a_leg():
    log = close_segments([fill(0, 1000, 30), fill(10, 1500, 40)], [tyres(1.02, 1200)])
    (segment,) = log.segments
    assert segment.distance_km == pytest.approx(200 + 300 * 1.02)
    assert [(leg.start_km, leg.end_km, leg.entry) for leg in segment.legs] == [(1000, 1200, 1), (1200, 1500, 1)]
    assert segment.legs[0].end_day == segment.legs[1].start_day == day(4).toordinal()


def test_tyres_known_by_date_only_and_changed_back():
    entries = [fill(0, 1000, 30), fill(10, 2000, 40), fill(20, 3000, 40)]
    log = close_segments(entries, [tyres(1.0, None, 15), tyres(1.1, None, 10)])
    assert [s.distance_km for s in log.segments] == pytest.approx([1000, 500 * 1.1 + 500])


def test_impossible_odometer_factor_is_a_problem():
    log = close_segments([fill(0, 1000, 30), fill(10, 1500, 40)], [tyres(0.0, 1200)])
    assert log.segments[0].distance_km == 500
    assert "odometer factor" in log.problems[0].message


def test_order_given_does_not_matter_where_there_is_an_odometer():
    entries = [fill(n, 1000 + 300 * n, 20 + n, full=n % 3 != 1) for n in range(9)]
    assert close_segments(entries[::-1]).segments == close_segments(entries).segments


def test_date_against_the_odometer_is_a_problem_and_time_never_runs_backwards():
    entries = [fill(0, 1000, 30), fill(40, 1500, 30), fill(6, 2000, 30), fill(9, 2500, 30)]
    log = close_segments(entries)
    assert [s.distance_km for s in log.segments] == [500, 500, 500]
    assert log.days == tuple(day(n).toordinal() for n in (0, 0, 6, 9))
    assert [str(problem) for problem in log.problems] == [
        "the entry of 2026-02-10 at 1,500 km has a date that contradicts the odometer order"
    ]


def test_entries_of_one_day_keep_their_order():
    log = close_segments([fill(0, 1000, 30), fill(1, 1300, 20), fill(1, 1600, 21), fill(1, 1900, 22)])
    assert [s.energy for s in log.segments] == [20, 21, 22]
    assert not log.problems


@pytest.mark.parametrize("entries", [[], [fill(0, 1000, 30)]])
def test_too_few_entries_are_an_empty_log(entries):
    log = close_segments(entries)
    assert (log.segments, log.open_legs, log.void, log.problems) == ((), (), (), ())


def test_long_log_is_walked_once():
    entries = [Entry("van", dt.date(1700, 1, 1) + dt.timedelta(n), 30.0, 500.0 * n) for n in range(50_000)]
    log = close_segments(entries)
    assert len(log.segments) == 49_999
    assert sum(s.distance_km for s in log.segments) == 500.0 * 49_999
