"""Energy and distance are conserved whatever the order of partial fills, readings, lost receipts and fittings.

The log is written from a tank whose true level is known at every moment, so the reference is the first law
(energy balance), not the code under test.
"""

from __future__ import annotations

import random
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from energytrack.consumption.segments import close_segments
from energytrack.consumption.shares import shares
from energytrack.logbook.records import Entry
from tests.consumption.logs import fill, fitted, tyres

CAPACITY = 60.0

visits = st.lists(
    st.tuples(
        st.floats(10, 900),  # km
        st.floats(0.01, 0.06),  # used per km, at most 54 a leg
        st.sampled_from(["full", "partial", "reading", "lost"]),
        st.floats(0.05, 1.0),  # of the room left
    ),
    min_size=1,
    max_size=25,
)
switches = st.lists(st.floats(900, 15_000), min_size=0, max_size=8, unique=True)


def drive(stops: list[tuple[float, float, str, float]]) -> tuple[list[Entry], list[float]]:
    """Entries of a tank of known level, and what was truly used up to each of them (running total)."""
    level, odometer, used = CAPACITY, 1000.0, 0.0
    entries, running, lost = [fill(0, odometer, 50.0)], [0.0], False
    for number, (km, rate, kind, part) in enumerate(stops, start=1):
        use = min(km * rate, level * 0.99)
        odometer, used, level = odometer + km, used + use, level - use
        bought = CAPACITY - level if kind == "full" else part * (CAPACITY - level)
        level = CAPACITY if kind == "full" else level + bought
        if kind == "lost":
            lost = True
            continue
        reading = 100 * level / CAPACITY if kind == "reading" else None
        entries.append(fill(number, odometer, bought, full=kind == "full", level_percent=reading, missed=lost))
        running.append(used)
        lost = False
    return entries, running


@given(visits)
def test_each_segment_uses_what_the_tank_lost(stops):
    entries, running = drive(stops)
    log = close_segments(entries, capacity=CAPACITY)
    at = dict(zip(log.positions, running, strict=True))
    for segment in log.segments:
        assert segment.energy == pytest.approx(at[segment.end_km] - at[segment.start_km], abs=1e-6)
        assert segment.distance_km == pytest.approx(segment.end_km - segment.start_km)


@given(visits)
def test_all_that_was_driven_is_in_a_segment_a_void_or_open(stops):
    entries, _ = drive(stops)
    log = close_segments(entries, capacity=CAPACITY)
    measured = sum(segment.distance_km for segment in log.segments)
    void = sum(span.end_km - span.start_km for span in log.void)
    still_open = sum(leg.distance_km for leg in log.open_legs)
    assert measured + void + still_open == pytest.approx(log.positions[-1] - log.positions[0])


@given(visits)
def test_used_and_level_change_add_up_to_what_was_bought(stops):
    entries, _ = drive([stop for stop in stops if stop[2] != "lost"])
    log = close_segments(entries, capacity=CAPACITY)
    known = [n for n, entry in enumerate(entries) if entry.full or entry.level_percent is not None]
    last = entries[known[-1]]
    level = CAPACITY if last.level_percent is None else last.level_percent / 100 * CAPACITY
    bought = sum(entry.energy for entry in entries[1 : known[-1] + 1])
    used = sum(segment.energy for segment in log.segments)
    assert used + level - CAPACITY == pytest.approx(bought, abs=1e-6)


@given(visits, st.randoms(use_true_random=False))
def test_order_of_the_rows_changes_nothing(stops, chance: random.Random):
    entries, _ = drive(stops)
    mixed = list(entries)
    chance.shuffle(mixed)
    assert close_segments(mixed, capacity=CAPACITY).segments == close_segments(entries, capacity=CAPACITY).segments


@given(visits, switches)
def test_fitted_distance_is_the_overlap_of_driving_and_fitting(stops, marks):
    entries, _ = drive(stops)
    log = close_segments(entries, capacity=CAPACITY)
    marks = sorted(marks)
    ends = [*marks[1::2], None] if len(marks) % 2 else marks[1::2]
    periods = [fitted(start, end) for start, end in zip(marks[::2], ends, strict=True)]
    found = shares(log, periods)
    assert all(-1e-12 <= share <= 1 + 1e-12 for share in found)
    for segment, share in zip(log.segments, found, strict=True):
        overlap = sum(
            max(0.0, min(segment.end_km, end or float("inf")) - max(segment.start_km, start))
            for start, end in zip(marks[::2], ends, strict=True)
        )
        assert share * segment.distance_km == pytest.approx(overlap, abs=1e-6)


@given(visits, switches, st.floats(0.9, 1.1), st.floats(1000, 9000))
def test_fitted_and_unfitted_distance_add_up_whatever_the_tyres(stops, marks, factor, tyres_at):
    entries, _ = drive(stops)
    log = close_segments(entries, [tyres(factor, tyres_at)], capacity=CAPACITY)
    marks = sorted(marks)[: len(marks) // 2 * 2]
    on = [fitted(start, end) for start, end in zip(marks[::2], marks[1::2], strict=True)]
    off = [fitted(start, end) for start, end in zip([0.0, *marks[1::2]], [*marks[::2], None], strict=True)]
    for segment, share, rest in zip(log.segments, shares(log, on), shares(log, off), strict=True):
        assert share + rest == pytest.approx(1)
        before = min(max(tyres_at - segment.start_km, 0.0), segment.end_km - segment.start_km)
        after = segment.end_km - segment.start_km - before
        assert segment.distance_km == pytest.approx(before + factor * after)


@given(visits, switches, st.floats(-3, 3))
def test_level_scales_the_share(stops, marks, level):
    entries, _ = drive(stops)
    log = close_segments(entries, capacity=CAPACITY)
    marks = sorted(marks)[: len(marks) // 2 * 2]
    plain = [fitted(start, end) for start, end in zip(marks[::2], marks[1::2], strict=True)]
    graded = [replace(row, level=level) for row in plain]
    assert shares(log, graded) == pytest.approx([level * share for share in shares(log, plain)], abs=1e-9)
