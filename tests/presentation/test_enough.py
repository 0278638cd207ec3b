"""The whole answer of every verdict, compared as text; bounds that hold for any answer."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from rich.cells import cell_len

from energytrack.inference.results import Assessment, Covariate, Look, Noise, Rule
from energytrack.presentation.conditions import rows
from energytrack.presentation.enough import render
from tests.presentation.samples import EVERY_VERDICT, NOT_YET, OUT_OF_REACH, SHIFTED

EXPECTED = Path(__file__).parent / "expected"
HOSTILE = "\x1b[31mred\x1b[0m [bold]not bold[/bold] \u202egnp.exe\x07 :car:"


def shown(a: Assessment, **options: object) -> str:
    return "\n".join(line.plain for line in render(a, **options)) + "\n"  # type: ignore[arg-type]


@pytest.mark.parametrize("verdict", EVERY_VERDICT)
def test_the_whole_text_of_each_verdict(verdict: str) -> None:
    expected = (EXPECTED / f"{verdict}.txt").read_text(encoding="utf-8")
    assert shown(EVERY_VERDICT[verdict]) == expected


def test_the_whole_text_in_miles_with_its_picture() -> None:
    expected = (EXPECTED / "not-yet-miles.txt").read_text(encoding="utf-8")
    assert shown(NOT_YET, unit="mi", title=True, draw=True) == expected


@pytest.mark.parametrize("width", [60, 80, 100])
@pytest.mark.parametrize("verdict", EVERY_VERDICT)
def test_no_line_is_wider_than_the_screen(verdict: str, width: int) -> None:
    long_name = "Seitenverkleidung漢字" * 12
    a = replace(EVERY_VERDICT[verdict], modification=long_name, warnings=("w" * 300, "two words"))
    lines = shown(a, width=width, title=True, draw=True).splitlines()
    assert max(map(cell_len, lines)) <= width


@pytest.mark.parametrize("verdict", EVERY_VERDICT)
def test_the_answer_comes_first(verdict: str) -> None:
    first = shown(EVERY_VERDICT[verdict]).split()[0]
    assert first in {"Yes:", "No:", "Not", "Out", "No", "Unclear:", "Doubtful:"}


def test_hostile_names_stay_words() -> None:
    a = replace(NOT_YET, vehicle=HOSTILE, modification=HOSTILE, warnings=(HOSTILE,))
    a = replace(a, covariates={HOSTILE: Covariate(1.0, 0.2, 3.0, 0.0, 3.0, HOSTILE)})
    text = shown(a, title=True)
    assert "[bold]not bold[/bold]" in text.replace("\n", " ")
    assert ":car:" in text
    for control in ("\x1b", "\u202e", "\x07"):
        assert control not in text


def test_a_figure_and_its_unit_stay_on_one_line() -> None:
    for width in range(60, 101):
        lines = [line.strip() for line in shown(NOT_YET, width=width).splitlines() if line.strip()]
        assert not [line for line in lines if line.split()[0] in {"km", "%", "days", "°C"}]


def test_figures_that_do_not_exist_are_left_out() -> None:
    a = replace(
        NOT_YET,
        shift_percent=None,
        interval_percent=None,
        standard_error_percent=None,
        degrees_of_freedom=None,
        distance_to_go_interval_km=None,
        days_to_go=None,
        distance_expected_km=None,
        resolvable_now_percent=None,
        resolvable_at_best_percent=None,
        noise=None,
        covariates={},
        looks=(),
        expectation=None,
        warnings=(),
    )
    text = shown(a, draw=True)
    assert "None" not in text
    assert "nan" not in text
    assert "Nothing measured with it so far." in text.replace("\n", " ")


def test_an_endless_range_is_said_in_words() -> None:
    a = replace(NOT_YET, distance_to_go_interval_km=(1120.0, None), degrees_of_freedom=float("inf"))
    text = shown(a)
    assert "1,100 km or more, no upper end in sight" in text.replace("\n                      ", " ")
    assert "inf" not in text
    assert "degrees of freedom" not in text


def test_one_degree_of_freedom_is_one() -> None:
    assert ", 1 degree of freedom\n" in shown(replace(NOT_YET, degrees_of_freedom=1.4))


def test_unbounded_range_is_said_in_words() -> None:
    text = shown(replace(NOT_YET, interval_percent=None)).replace("\n", " ")
    assert "So far -2.1 %, look-proof range still wide open." in text


def test_the_bar_is_never_full_before_the_end() -> None:
    bar = shown(replace(NOT_YET, information_fraction=0.9999)).splitlines()[3]
    assert bar == "[###############################.] 99 % of the evidence needed"


def test_the_bar_leaves_blank_what_this_log_never_reaches() -> None:
    # information goes with 1 / smallest shift squared: (3 / 6)^2 is a quarter of 32 cells
    a = replace(OUT_OF_REACH, information_fraction=0.125, resolvable_at_best_percent=6.0)
    bar, note = shown(a).split("\n\n")[1].splitlines()
    assert bar == "[####....                        ] 12 % of the evidence needed"
    assert note.strip() == "driving on like this: 25 % at most"


def test_shares_of_the_scatter_are_of_the_variance() -> None:
    # filling: 100 * sqrt(2) * 1.5 L / (0.1 L/km * 300 km) = 7.07 %; 7.07^2 = 50, 5^2 = 25, 4^2 + 3^2 = 25
    expectation = replace(NOT_YET.expectation, consumption=0.1) if NOT_YET.expectation else None
    a = replace(
        NOT_YET,
        noise=Noise(5.0, 1.5, 4.0, 3.0),
        expectation=expectation,
        distance_baseline_km=2400.0,
        segments_baseline=8,
        distance_modified_km=600.0,
        segments_modified=2,
    )
    text = shown(a)
    assert "from trip to trip   5.0 %, 25 % of the variance" in text
    assert "filling             7.1 %, 1.5 L a filling, 50 % of the variance" in text
    assert "drift over weeks    4.0 %, 16 % of the variance" in text
    assert "drift over seasons  3.0 %, 9 % of the variance" in text


def test_the_picture_keeps_to_a_dozen_rows_and_the_settling_look() -> None:
    looks = tuple(
        Look(50_000.0 + 100 * i, "2026-05-01", min(1.0, i / 60), -5.0, (-5.0 - 100 / (i + 1), 0.1), 3.0)
        for i in range(75)
    )
    a = replace(SHIFTED, looks=looks, settled_at_km=53_300.0)
    picture = shown(a, draw=True).split("\n\n")[2].splitlines()
    assert len(picture) <= 13
    settled = [line for line in picture if line.endswith("settled")]
    assert len(settled) == 1
    assert "53,300 km" in settled[0]
    assert picture[2].strip().startswith("50,000 km")
    assert picture[-1].strip().startswith("57,400 km")


def test_at_most_three_next_steps() -> None:
    for a in EVERY_VERDICT.values():
        steps = [line for line in shown(a).splitlines() if line.startswith("> ")]
        assert 1 <= len(steps) <= 3


@pytest.mark.parametrize("width", [60, 80])
@pytest.mark.parametrize("verdict", EVERY_VERDICT)
def test_a_known_change_is_recommended_while_the_answer_is_open_and_none_was_logged(verdict: str, width: int) -> None:
    a = replace(EVERY_VERDICT[verdict], known_change_logged=False)
    text = " ".join(shown(a, width=width).split())
    assert ("--known 4:9" in text) == a.is_open
    assert ("only where it is safe" in text) == a.is_open
    assert "--known" not in shown(EVERY_VERDICT[verdict], width=width)


@pytest.mark.parametrize(
    ("rule", "words"),
    [
        ("every-look", "however often you look"),
        ("counted", "at the looks taken so far"),
        ("open-ended", "however often and however long you look"),
    ],
)
def test_the_rule_stands_beside_the_range(rule: Rule, words: str) -> None:
    assert words in " ".join(shown(replace(NOT_YET, rule=rule)).split())


def test_what_is_driven_already_is_not_still_to_go() -> None:
    assert "still to go" not in shown(replace(NOT_YET, rule="open-ended", distance_to_go_km=0.0))


def test_no_temperature_is_minus_nought() -> None:
    heating = Covariate(0.61, 0.08, -8.5, -0.3, 18.4, "temperature_c")
    assert "here 0\u00a0to\u00a018\u00a0°C" in rows({"heating": heating}, "km")[0][1]
