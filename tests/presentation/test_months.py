"""Months as bars: plain ASCII, within the width, a row for each month."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from energytrack.inference.regimes.results import Break
from energytrack.inference.results import SetAside
from energytrack.inference.review.results import (
    Carbon,
    Difference,
    Driven,
    Level,
    Price,
    Quality,
    RegimeChange,
    Review,
    UnderTest,
    Worth,
)
from energytrack.logbook.records import Vehicle
from energytrack.presentation import months, review_rows
from energytrack.presentation.review import render
from energytrack.presentation.review_steps import next_steps

VAN = Vehicle("van", "diesel", "L")
DRIVEN = Driven("2026-03", 1234.4, 1234.4, 98.7, 0.08, 101.5, 150.0, 0.1216, 3)
LEVELS = (
    Level("2025-12", 0.080, (0.076, 0.084), 900.0),
    Level("2026-02", 0.082, (0.079, 0.085), 1000.0),
    Level("2026-03", 0.078, (0.074, 0.082), 1234.0),
)
PRICE = Price("EUR", 1.5, 0.08, 20_000.0, 2_400.0, "2025-03-20", False)
BASELINE = Difference("baseline", "all driving before this month", 0.081, -3.7, (-8.0, 0.9), 20.0, 2.0)
REVIEW = Review(
    vehicle="van",
    month="2026-03",
    unit="L",
    confidence=0.95,
    counted_until=None,
    this=DRIVEN,
    month_before=replace(DRIVEN, month="2026-02", cost=None, cost_per_km=None),
    year_ago=None,
    level=LEVELS[-1],
    level_note=None,
    differences=(BASELINE,),
    levels=LEVELS,
    reference_conditions={},
    carbon=(),
    price=None,
    price_note="no entry of the last 12 months has a cost: log it with --cost",
    modifications=(),
    regimes=(),
    set_aside=(),
    quality=Quality(3, 0, 0, 0, 0, 0, 0.0),
    warnings=(),
)


def shown(found: Review, vehicle: Vehicle = VAN, width: int = 80) -> str:
    return "\n".join(line.plain for line in render(found, vehicle, width))


def a_test(**values: Any) -> UnderTest:
    usual = UnderTest("skirts", "not-yet", False, 3.0, -1.0, (-4.0, 2.0), 0.5, 900.0, 2500.0, 40.0, None, True, None)
    return replace(usual, **values)


def test_bars() -> None:
    """43 columns from 7.40 to 8.50: 7.60, 8.00 and 8.40 stand in columns 8, 23 and 38, the baseline (8.10) in 27."""
    assert months.lines(REVIEW, VAN, 60) == [
        "L/100 km at reference conditions, month by month: o level,",
        "(---) 95 % range, : baseline",
        "2025-12          (--------------o---:----------)        8.00",
        "2026-01  nothing measured",
        "2026-02                     (-------:---o----------)    8.20",
        "2026-03  (--------------o-----------:---)               7.80",
        "         7.40                                   8.50",
    ]


@pytest.mark.parametrize("width", [60, 80, 100])
@pytest.mark.parametrize("display", ["L/100km", "mpg-us", "km/L"])
def test_everything_fits_the_width_in_plain_characters(width: int, display: str) -> None:
    text = shown(REVIEW, replace(VAN, display=display), width)
    assert max(map(len, text.splitlines())) <= width
    assert text.isascii()


def test_numbers_are_never_cut_where_columns_do_not_fit() -> None:
    rich = replace(DRIVEN, cost=123456789.12, cost_per_km=1234.5)
    text = shown(replace(REVIEW, this=rich, month_before=rich, year_ago=rich), width=60)
    assert text.count("123,456,789.12") == 3


def test_distance_per_energy_turns_the_range_around() -> None:
    (row,) = [line for line in months.lines(REVIEW, replace(VAN, display="km/L"), 80) if line.startswith("2026-03")]
    assert row.index("(") < row.index("o") < row.index(")")
    assert row.endswith("12.8")


def test_one_month_makes_no_picture() -> None:
    assert months.lines(replace(REVIEW, levels=LEVELS[:1]), VAN, 80) == []


def test_the_sentence_comes_first_and_owns_up() -> None:
    first = shown(REVIEW).split("\n\n")[0].replace("\n", " ")
    assert first == (
        "van in 2026-03: 1,234 km at 8.00 L/100 km as measured. At reference conditions 7.80 L/100 km, not told from "
        "its baseline (-3.7 %, range -8.0 to +0.9 %)."
    )
    told = replace(REVIEW, differences=(replace(BASELINE, interval_percent=(-6.0, -1.4)),))
    assert "3.7 % below its baseline (range -6.0 to -1.4 %)" in shown(told).replace("\n", " ")


def test_weather_is_named_where_it_made_the_difference() -> None:
    before = Difference("month-before", "2026-02", 0.08, 0.4, (-2.0, 3.0), 20.0, 9.0)
    text = shown(replace(REVIEW, differences=(before, BASELINE))).replace("\n", " ")
    assert "Against 2026-02 it is +9.0 % as measured, +0.4 % once the conditions are taken out." in text


def test_carbon_without_a_grid_factor_is_not_stated() -> None:
    own = (Carbon("petrol", 10.0, "L", 22.0, 2.2, "a table"), Carbon("electricity", 20.0, "kWh", None, None, None))
    rows = dict(review_rows.carbon(replace(REVIEW, carbon=own)))
    assert rows["  electricity"].startswith("not stated: give --grid-factor")
    assert "  together" not in rows
    stated = replace(own[1], kg=6.0, kg_per_unit=0.3, source="stated")
    assert "28.0" in dict(review_rows.carbon(replace(REVIEW, carbon=(own[0], stated))))["  together"]


def test_money_says_where_nothing_is_resolved() -> None:
    open_one = a_test(worth=Worth(20.0, (-48.0, 96.0), False, 300.0, None, None))
    settled = a_test(name="deflector", worth=Worth(120.0, (60.0, 180.0), True, 300.0, 50_000.0, (33_333.0, 100_000.0)))
    loss = a_test(name="box", worth=Worth(-96.0, (-144.0, -48.0), True, 300.0, None, None))
    rows = dict(review_rows.money(replace(REVIEW, price=PRICE, modifications=(open_one, settled, loss)), VAN))
    plain = {name: text.replace("\u00a0", " ") for name, text in rows.items()}
    assert plain["  skirts"] == "not resolved yet: 48 EUR lost to 96 EUR saved; payback not resolved yet"
    assert plain["  deflector"] == (
        "saves about 120 EUR (60 to 180 EUR); 300 EUR paid back after 50,000 km (33,000 to 100,000 km)"
    )
    assert plain["  box"] == "costs about 96 EUR (48 to 140 EUR); never paid back"


def test_at_most_three_steps() -> None:
    tests = tuple(a_test(name=f"part {k}") for k in range(5))
    steps = next_steps(replace(REVIEW, modifications=tests, quality=Quality(3, 3, 1, 1, 0, 1, 0.0)), VAN)
    assert len(steps) == 3
    assert next_steps(REVIEW, VAN) == ["Nothing stands out: drive on and log every entry."]


def test_more_used_asks_for_a_look_at_the_vehicle() -> None:
    more = replace(BASELINE, percent=5.0, interval_percent=(2.0, 8.0))
    (step,) = next_steps(replace(REVIEW, differences=(more,)), VAN)
    assert "more than its baseline" in step
    assert "when parked" in step


def test_hostile_names_reach_no_terminal() -> None:
    bad = "a\x1b[31m\u202eb"
    text = shown(replace(REVIEW, vehicle=bad, modifications=(a_test(name=bad),)))
    assert "\x1b" not in text
    assert "\u202e" not in text


def test_a_change_nobody_logged_is_asked_about() -> None:
    found = Break(
        46_186.0, "2026-02-01", (45_000.0, 47_000.0), ("2026-01-20", "2026-02-10"), 6.2, (3.0, 9.0), 0.001, None, (),
        "nothing logged", ("tyres",), "Have brakes inspected by a qualified person.",
    )  # fmt: skip
    news = replace(REVIEW, regimes=(RegimeChange(found, new=True),))
    caution, asked = next_steps(news, VAN)
    assert caution == found.caution
    assert asked.replace("\u00a0", " ").endswith('log it: energytrack event "WHAT HAPPENED" 46186 --vehicle van')
    assert "new this month: +6.2 %" in shown(news)
    old = replace(REVIEW, regimes=(RegimeChange(found, new=False),))
    assert next_steps(old, VAN) == ["Nothing stands out: drive on and log every entry."]


def test_an_odd_entry_is_not_blamed_on_the_weather() -> None:
    before = Difference("month-before", "2026-02", 0.08, 0.4, (-2.0, 3.0), 20.0, 9.0)
    odd = SetAside(1200.0, "2026-03-07", 60.0, 8.0, "twice", "strike one", False, 1200.0, ("1200 --energy 30",))
    text = shown(replace(REVIEW, differences=(before,), set_aside=(odd,))).replace("\n", " ")
    assert "once the conditions and what stands out are taken out" in text
    assert "energytrack amend 1200 --energy 30 --vehicle van" in text
