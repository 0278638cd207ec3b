"""Single switches as periods, and switches that cannot be."""

from __future__ import annotations

import datetime as dt

import pytest
from hypothesis import given
from hypothesis import strategies as st

from energytrack.errors import EntryError
from energytrack.logbook.records import Modification
from energytrack.logbook.switches import Switch, check_switch, in_order, pair

DAY = dt.date(2026, 5, 3)


def on(km: float | None, level: float | None = None, date: dt.date | None = None) -> Switch:
    return Switch("skirts", True, date, km, level)


def off(km: float | None, date: dt.date | None = None) -> Switch:
    return Switch("skirts", False, date, km)


def spans(switches: list[Switch]) -> list[tuple[float | None, float | None, float | None]]:
    return [(each.fitted_km, each.removed_km, each.level) for each in pair("van", switches)]


def test_fitted_twice_is_two_periods() -> None:
    assert spans([on(100), off(200), on(300)]) == [(100, 200, None), (300, None, None)]


def test_order_of_logging_does_not_matter() -> None:
    assert spans([on(300), on(100), off(200)]) == [(100, 200, None), (300, None, None)]


def test_another_level_ends_the_earlier_one() -> None:
    assert spans([on(100, 2.0), on(200, 2.4)]) == [(100, 200, 2.0), (200, None, 2.4)]


def test_dates_alone_give_the_order() -> None:
    periods = pair("van", [off(None, DAY), on(None, date=DAY - dt.timedelta(days=9))])
    assert periods == [Modification("van", "skirts", DAY - dt.timedelta(days=9), removed_date=DAY)]


def test_parts_are_kept_apart() -> None:
    other = Switch("roof box", True, None, 150)
    names = [(each.name, each.removed_km) for each in pair("van", [on(100), other, off(200)])]
    assert names == [("skirts", 200), ("roof box", None)]


def day(number: int) -> dt.date:
    return DAY + dt.timedelta(days=number)


def test_dates_stand_among_odometer_values() -> None:
    """By date where both have one; without a date, as logged."""
    one, three = on(100, date=day(1)), off(300, day(5))
    between = off(None, day(3))
    assert in_order([three, between, one]) == [one, between, three]
    undated = off(200)
    assert in_order([one, undated, on(None, date=day(3)), three]) == [one, undated, on(None, date=day(3)), three]
    assert in_order([one, off(None, day(3)), on(200), three]) == [one, off(None, day(3)), on(200), three]


def test_on_one_day_and_at_one_value_the_order_of_logging_counts() -> None:
    assert in_order([on(100, date=DAY), off(None, DAY)]) == [on(100, date=DAY), off(None, DAY)]
    assert in_order([off(None, DAY), on(100, date=DAY)]) == [off(None, DAY), on(100, date=DAY)]
    assert in_order([off(100, DAY), on(100)]) == [off(100, DAY), on(100)]
    assert in_order([on(100, date=day(2)), off(100, DAY)]) == [off(100, DAY), on(100, date=day(2))]


@given(
    st.lists(st.tuples(st.one_of(st.none(), st.integers(1, 6)), st.one_of(st.none(), st.integers(1, 6))), max_size=7),
    st.randoms(use_true_random=False),
)
def test_odometer_values_rise_and_so_do_dates_alone(places: list[tuple[int | None, int | None]], random) -> None:
    """Whatever lacks a value: the order holds for those that have one, and keeps its own under sorting again."""
    switches = [
        Switch("skirts", True, day(date or at or 1) if date or not at else None, at and 100.0 * at)
        for at, date in places
    ]
    random.shuffle(switches)
    found = in_order(switches)
    assert sorted(map(id, found)) == sorted(map(id, switches))
    values = [each.km for each in found if each.km is not None]
    assert values == sorted(values)
    alone = [each.date for each in found if each.km is None and each.date is not None]
    assert alone == sorted(alone)
    assert in_order(found) == found


@given(st.permutations(range(6)))
def test_any_order_of_logging_gives_the_same_where_every_place_is_known(order: list[int]) -> None:
    """Odometer values and dates that agree, some with a date alone on a day of its own."""
    truth = [Switch("skirts", n % 2 == 0, day(n), None if n in (1, 4) else 100.0 * n) for n in range(6)]
    assert in_order([truth[n] for n in order]) == truth


@pytest.mark.parametrize(
    ("logged", "new", "refusal"),
    [
        ([on(100)], on(200), "is fitted to van since 100 km"),
        ([on(100, 2.4)], on(200, 2.4), "is fitted to van since 100 km"),
        ([], off(100), "fitted now: nothing"),
        ([on(100)], off(50), "not fitted to van at 50 km; fitted now: 'skirts'"),
        ([on(100), off(200)], off(300), "fitted now: nothing"),
        ([on(100), off(200)], off(150), "fitted now: nothing"),
    ],
)
def test_impossible_switches_are_refused(logged: list[Switch], new: Switch, refusal: str) -> None:
    with pytest.raises(EntryError, match=refusal):
        check_switch("van", logged, new)


@given(st.lists(st.tuples(st.booleans(), st.integers(0, 30), st.sampled_from([None, 1.0, 2.0])), max_size=12))
def test_periods_of_accepted_switches_never_overlap(attempts: list[tuple[bool, int, float | None]]) -> None:
    logged: list[Switch] = []
    for fitted, km, level in attempts:
        new = Switch("skirts", fitted, None, float(km), level if fitted else None)
        try:
            check_switch("van", logged, new)
        except EntryError:
            continue
        logged.append(new)
    periods = pair("van", logged)
    assert len(periods) == sum(each.fitted for each in logged)
    ends = [each.removed_km for each in periods]
    starts = [each.fitted_km for each in periods]
    following = zip(ends[:-1], starts[1:], strict=True)
    assert all(end is not None and start is not None and end <= start for end, start in following)
