"""Designs compared: sentence, tables, next steps."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace
from pathlib import Path

import pytest
from rich.cells import cell_len

from energytrack.inference.results import LongerBaseline, Plan
from energytrack.logbook.records import Modification
from energytrack.presentation.plan import periods, render, sentence
from tests.presentation.samples import PLAN

EXPECTED = Path(__file__).parent / "expected"
FITTED = ["side skirts: from 48,900 km, to 52,100 km"]


def shown(p: Plan, **options: object) -> str:
    return "\n".join(line.plain for line in render(p, **options)) + "\n"  # type: ignore[arg-type]


def said(p: Plan) -> str:
    return sentence(p).replace("\u00a0", " ")


@pytest.mark.parametrize("unit", ["km", "mi"])
def test_the_whole_text(unit: str) -> None:
    expected = (EXPECTED / f"plan-{unit}.txt").read_text(encoding="utf-8")
    assert shown(PLAN, unit=unit, fitted=FITTED) == expected


@pytest.mark.parametrize("unit", ["km", "mi"])
def test_no_line_is_wider_than_80_columns_at_great_distances(unit: str) -> None:
    far = tuple(
        replace(d, distance_km=412_400.0, distance_interval_km=(301_000.0, 999_000.0), days=4100.0, swaps=1234)
        for d in PLAN.designs
    )
    lines = shown(replace(PLAN, designs=far), unit=unit, fitted=FITTED, title=True).splitlines()
    assert max(map(cell_len, lines)) <= 80
    assert any("410,000 km" in line or "260,000 mi" in line for line in lines)


def test_fewest_swaps_among_ways_about_as_short() -> None:
    assert said(PLAN) == (
        "To show 3 %, one switch takes about 12,000 km (81 days), off and on every 2 fill-ups about 5,300 km "
        "(35 days): about 7,000 km less."
    )


def test_one_switch_that_cannot() -> None:
    one, *others = PLAN.designs
    p = replace(PLAN, designs=(replace(one, distance_km=None, days=None), *others))
    assert said(p).startswith("One switch now cannot show 3 % with this log, however far you drive; off and on every 2")


def test_alternating_that_takes_longer_or_cannot() -> None:
    one, *others = PLAN.designs
    longer = replace(PLAN, designs=(one, replace(others[0], distance_km=15_000.0)))
    assert said(longer).endswith("about 3,000 km more.")
    p = replace(PLAN, designs=(one, others[-1]))
    assert said(p).endswith("no other way gets there.")


def test_nothing_that_can() -> None:
    p = replace(PLAN, designs=(replace(PLAN.designs[0], distance_km=None), PLAN.designs[-1]))
    assert said(p) == "Out of reach: no way of testing shows 3 % with this log, however far you drive."


def test_too_little_driven_for_a_plan() -> None:
    p = replace(PLAN, designs=(), noise=None, segments_baseline=2, distance_baseline_km=700.0)
    assert "Drive about 2,500 km as usual first" in said(p)
    assert "None" not in shown(p)


def test_where_modified_periods_are() -> None:
    rows = [
        Modification("van", "skirts", None, 48_900.0, None, 52_100.0),
        Modification("van", "rack\x1b[2J", dt.date(2026, 5, 3)),
    ]
    assert [said.replace("\u00a0", " ") for said in periods(rows, "km")] == [
        "skirts: from 48,900 km, to 52,100 km",
        "rack\x1b[2J: from 2026-05-03, still on",
    ]
    assert "\x1b" not in shown(PLAN, fitted=periods(rows, "km"))


def test_every_kind_of_way_has_a_name_that_fits() -> None:
    one = PLAN.designs[0]
    kinds = (
        replace(one, name="best-date", start="2026-09-01"),
        replace(one, name="on-off-on", phases=(16, 8), swaps=3),
        replace(one, name="alternate-weekly", swaps=12),
        replace(one, name="longer-baseline", phases=(160,)),
    )
    text = shown(replace(PLAN, designs=(one, *kinds)))
    for name in ("one switch in Sep 2026", "on 16, off 8, on (fill-ups)", "off and on every week"):
        assert text.count(name) >= 3
    assert text.count("one switch after 160 fill-ups") >= 3
    assert max(map(cell_len, text.splitlines())) <= 80


def test_a_narrow_screen_folds_names_and_cuts_nothing() -> None:
    narrow, wide = shown(PLAN, width=60), shown(PLAN)
    assert max(map(cell_len, narrow.splitlines())) <= 60
    assert "\u2026" not in narrow
    assert sorted("".join(narrow.split())) == sorted("".join(wide.split()))


def test_a_part_that_stays_on() -> None:
    text = shown(replace(PLAN, designs=PLAN.designs[:1], reversible=False))
    assert "! It cannot be taken off again: ways that take it off are left out." in text
    assert "mod removed" not in text


def test_a_stated_plan_says_that_nothing_was_measured() -> None:
    text = " ".join(shown(replace(PLAN, stated=True)).split())
    assert "baseline, stated 8,423 km in 19 fill-ups; distances count from after it" in text
    assert "3.1 % from trip to trip" in text
    assert "log so far" not in text


def test_what_would_shorten_the_best_way() -> None:
    assert "> Fill to the first click" in shown(replace(PLAN, designs=PLAN.designs[:2]))
    assert "first click" not in shown(PLAN)


def test_a_stated_plan_says_what_a_longer_baseline_would_do() -> None:
    one = replace(PLAN.designs[0], distance_km=None, distance_interval_km=None, days=None)
    far = replace(PLAN, stated=True, distance_baseline_km=3000.0, designs=(one, *PLAN.designs[1:]))
    never = "A longer baseline alone does not bring one switch within reach"
    assert never in " ".join(shown(far).split())
    told = " ".join(shown(replace(far, with_longer_baseline=LongerBaseline(24_000.0, 13_600.0))).split())
    assert "after 24,000 km without it, not 3,000 km, one switch takes about 14,000 km (--baseline 24000)" in told
    assert never not in told
    assert "longer baseline" not in shown(PLAN)


def test_out_of_reach_asks_for_the_same_with_a_larger_shift() -> None:
    """Whatever else was stated stays: the suggestion is no command of its own."""
    none = tuple(replace(way, distance_km=None, distance_interval_km=None, days=None) for way in PLAN.designs)
    text = shown(replace(PLAN, designs=none, stated=True))
    assert "> Ask for a larger shift: the same with --target 6" in text
    assert "energytrack plan --target" not in text


def test_a_large_resolvable_shift_is_shown_in_whole_percent() -> None:
    one = replace(PLAN.designs[0], resolvable_percent={1000: 26.63, 2500: 9.81})
    assert ["27", "%", "9.8", "%"] in [line.split()[-4:] for line in shown(replace(PLAN, designs=(one,))).splitlines()]
