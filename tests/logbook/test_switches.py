"""Single switches as periods, and switches that cannot be."""

from __future__ import annotations

import datetime as dt

import pytest
from hypothesis import given
from hypothesis import strategies as st

from energytrack.errors import EntryError
from energytrack.logbook.records import Modification
from energytrack.logbook.switches import Switch, check_switch, pair

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
