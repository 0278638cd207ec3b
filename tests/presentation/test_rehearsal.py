"""A rehearsal as text: what it says, and that it fits."""

from __future__ import annotations

from dataclasses import replace

import pytest

from energytrack.inference.rehearsal_results import Placebo, Rate, Rehearsal, Scenario, Settled
from energytrack.inference.results import Noise
from energytrack.presentation.rehearsal import next_steps, render, sentence


def rate(count: int, low: float, high: float) -> Rate:
    return Rate(count, 200, count / 2, (low, high))


NO_SHIFT = Scenario(
    0.0, rate(4, 0.5, 5.0), rate(130, 58.0, 71.6), rate(66, 26.6, 39.9), rate(196, 95.0, 99.5), rate(194, 93.6, 98.9),
    Settled(9_350.0, (8_600.0, 10_200.0), (5_100.0, None)),
)  # fmt: skip
SHIFTED = Scenario(
    -3.0, rate(162, 74.9, 86.2), rate(1, 0.0, 2.8), rate(37, 13.4, 24.4), rate(195, 94.3, 99.2), rate(200, 98.2, 100.0),
    Settled(4_120.0, (3_800.0, 4_500.0), (1_900.0, 110_400.0)),
)  # fmt: skip
PLACEBO = (
    Placebo(10, 40, 5, 1, 3, 17, 9, (52_310.0,)),
    Placebo(20, 40, 2, 0, 1, 30, 18, ()),
    Placebo(40, 22, 1, 0, 0, 22, 12, ()),
)
REHEARSAL = Rehearsal(
    "van", "side skirts", False, "L", 3.0, 0.95, 0.8, 200, 0, 55, 91, 52_839.0, 91,
    Noise(3.1, 0.61, 0.9, 0.6), NO_SHIFT, SHIFTED, PLACEBO, ("1 span set aside",),
)  # fmt: skip


def text(rehearsal: Rehearsal, unit: str = "km", width: int = 80) -> list[str]:
    return [line.plain for line in render(rehearsal, unit=unit, width=width, title=True)]


def words(rehearsal: Rehearsal) -> str:
    return " ".join(next_steps(rehearsal)).replace("\u00a0", " ")


def test_the_first_sentence_says_it_all():
    assert sentence(REHEARSAL).replace("\u00a0", " ") == (
        "On 200 logs like yours without any shift, 4 were called one (2.0 %, 0.5 to 5.0 %); a shift of 3 % was found "
        "in 81 % (75 to 86 %); half of these were settled within 4,100 km with it fitted."
    )
    one = replace(REHEARSAL, no_shift=replace(NO_SHIFT, called_shifted=rate(1, 0.0, 2.8)))
    assert "1 was called one" in sentence(one)


@pytest.mark.parametrize("unit", ["km", "mi"])
def test_it_fits_eighty_columns(unit: str):
    far = Settled(120_000.0, (110_000.0, 130_000.0), (100_000.0, 240_000.0))
    longest = replace(REHEARSAL, no_shift=replace(NO_SHIFT, settled=far), target_shift=replace(SHIFTED, settled=far))
    for rehearsal in (REHEARSAL, longest, replace(REHEARSAL, pretended=True, modification="")):
        lines = text(rehearsal, unit)
        assert max(map(len, lines)) <= 80
        assert "\u00a0" not in "".join(lines)


def test_the_tables():
    lines = text(REHEARSAL)
    assert lines[0] == "van: side skirts"
    assert "called shifted                     2.0 %  (0.5 to 5.0)        81 %  (75 to 86)" in lines
    assert "settled within, median                        9,400 km                4,100 km" in lines
    assert "  middle 80 % of the logs             5,100 km or more     1,900 to 110,000 km" in lines
    assert "two averages, looking once 22 % 45 % 55 %" in [" ".join(line.split()) for line in lines]
    assert "! 1 span set aside" in lines


def test_what_was_never_settled_is_said_so():
    never = replace(REHEARSAL, no_shift=replace(NO_SHIFT, settled=None), target_shift=replace(SHIFTED, settled=None))
    assert "settled" not in sentence(never)
    assert sum("not within this log" in line for line in text(never)) == 1


def test_advice_follows_the_figures():
    assert "no more frequent than the 5 % promised" in words(REHEARSAL)
    often = replace(REHEARSAL, no_shift=replace(NO_SHIFT, called_shifted=rate(30, 10.4, 20.7)))
    assert "More false alarms than the 5 % promised" in words(often)
    few = replace(REHEARSAL, runs=6, no_shift=replace(NO_SHIFT, called_shifted=Rate(0, 6, 0.0, (0.0, 45.9))))
    assert "energytrack rehearse --runs 200" in words(few)
    weak = replace(REHEARSAL, target_shift=replace(SHIFTED, called_shifted=rate(60, 23.7, 36.9)))
    assert "energytrack plan --target 3" in words(weak)
    strong = replace(REHEARSAL, target_shift=replace(SHIFTED, called_shifted=rate(190, 91.0, 97.6)))
    assert "long enough to find 3 % with a chance of 80 %" in words(strong)


def test_a_placebo_that_is_fooled_names_where():
    assert "Pretended changes" not in words(REHEARSAL)
    fooled = replace(REHEARSAL, placebo=(replace(PLACEBO[0], called_every_look=8, called_at_km=(51_000.0, 52_310.0)),))
    assert "between 51,000 km and 52,310 km" in words(fooled)
    assert "20 segments in a row" in words(replace(REHEARSAL, placebo=()))


def test_as_dict_holds_plain_values():
    found = REHEARSAL.to_dict()
    alarms = found["no_shift"]["called_shifted"]
    assert alarms == {"count": 4, "of": 200, "percent": 2.0, "interval_percent": [0.5, 5.0]}
    assert found["no_shift"]["settled"]["range_km"] == [5_100.0, None]
    assert found["placebo"][0]["called_at_km"] == [52_310.0]
