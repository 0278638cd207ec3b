"""What a break is held against, and where to look when nothing agrees."""

from __future__ import annotations

import datetime as dt

import pytest

from energytrack.inference.regimes.explain import explanation, matches, suspects
from energytrack.logbook.records import Event, Modification

KM, DATES = (48_200.0, 49_900.0), ("2026-04-20", "2026-05-20")
SKIRTS = Modification("van", "side skirts", dt.date(2026, 5, 3), 48_900.0, None, None)


def test_the_odometer_decides_where_it_is_known() -> None:
    late = Modification("van", "spoiler", dt.date(2026, 5, 3), 52_000.0, None, None)
    dated = Modification("van", "tyres", dt.date(2026, 5, 1), None, dt.date(2026, 9, 1), None)
    found = matches(49_000.0, KM, DATES, [late, SKIRTS, dated], [])
    assert [(one.what, one.kind) for one in found] == [("tyres", "fitted"), ("side skirts", "fitted")]


def test_removal_and_event_count() -> None:
    gone = Modification("van", "rack", dt.date(2025, 1, 1), 20_000.0, dt.date(2026, 5, 9), 49_100.0)
    event = Event("van", dt.date(2026, 5, 2), "new driver", 48_500.0)
    found = matches(49_000.0, KM, DATES, [gone], [event])
    assert [(one.what, one.kind) for one in found] == [("rack", "removed"), ("new driver", "event")]
    assert explanation(found, KM, DATES) == (
        "rack removed at 49,100 km, inside the break's range 48,200-49,900 km: agrees; so does new driver"
    )


def test_words_for_a_declared_one_and_for_none() -> None:
    found = matches(49_000.0, KM, DATES, [SKIRTS], [])
    assert explanation(found, KM, DATES) == (
        "side skirts fitted at 48,900 km, inside the break's range 48,200-49,900 km: agrees"
    )
    assert explanation((), KM, DATES) == (
        "unexplained: nothing was logged from 48,200 to 49,900 km (2026-04-20 to 2026-05-20)"
    )


@pytest.mark.parametrize(
    ("shift", "date", "unit", "word", "absent"),
    [
        (4.0, "2026-11-03", "L", "winter blend", "drags"),
        (12.0, "2026-07-03", "L", "drags", "winter"),
        (4.0, "2026-11-03", "kWh", "cold battery", "blend"),
        (-4.0, "2026-04-03", "L", "summer blend", "leak"),
        (-10.0, "2026-08-03", "L", "taken off the roof", "summer"),
    ],
)
def test_places_to_look_go_by_sign_size_and_season(
    shift: float, date: str, unit: str, word: str, absent: str
) -> None:
    places = " / ".join(suspects(shift, date, unit))
    assert word in places
    assert absent not in places
    assert "tyres" in places
    assert "driver" in places
