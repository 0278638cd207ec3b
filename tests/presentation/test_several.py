"""Several parts, variants and levels: whole texts compared, at eighty columns."""

from __future__ import annotations

from dataclasses import replace

from energytrack.inference.results import (
    Comparison,
    Effect,
    LevelEffect,
    PairwiseShift,
    Response,
    Standing,
    Together,
)
from energytrack.presentation import advice, answer, several
from tests.presentation.samples import CONTRADICTED, NOT_YET, SHIFTED

SKIRTS = Effect("skirts", -5.03, (-6.9, -3.1), 0.71, 9.0)
TYRES = Effect("tyres", 3.96, (1.8, 6.2), 0.80, 9.0)
BOTH = Effect("skirts + tyres", -1.07, (-3.4, 1.3), 0.85, 9.0)
RESPONSE = Response(
    "van",
    "wing",
    "parabola",
    0.0,
    (LevelEffect(0.0, 0.0, (0.0, 0.0)), LevelEffect(5.0, -6.1, (-8.0, -4.2)), LevelEffect(20.0, 0.4, (-2.0, 2.9))),
    SKIRTS,
    10.14,
    (8.9, 11.6),
    10.14,
    0.95,
    (),
)
FOUND = Comparison(
    "van",
    0.95,
    (
        PairwiseShift("dam A", "dam B", 6.2, (3.0, 9.4), 1.0, True),
        PairwiseShift("dam A", "nothing fitted", -1.8, (-5.2, 1.7), 0.8, False),
        PairwiseShift("dam B", "nothing fitted", -8.0, (-11.1, -4.8), 1.0, True),
    ),
    (Standing("dam B", -8.0, 0.998), Standing("dam A", -1.8, 0.002), Standing("nothing fitted", 0.0, 0.0)),
    ("1 span between known levels set aside: missed entry (1)",),
)
COMPARED = """\
dam B uses least: its range lies below that of every other.

pair by pair (95 % confidence for all pairs and however many looks)
  dam A / dam B       +6.2 %, look-proof range +3.0 to +9.4 %: differ
  dam A / nothing fitted
                      -1.8 %, look-proof range -5.2 to +1.7 %: not told apart
                      yet
  dam B / nothing fitted
                      -8.0 %, look-proof range -11.1 to -4.8 %: differ

chance that none of the others uses less, by this look alone
  dam B               over 99 %, -8.0 %
  dam A               under 1 %, -1.8 %
  nothing fitted      under 1 %, 0.0 %

! 1 span between known levels set aside: missed entry (1)"""


def test_parts_side_by_side() -> None:
    assert several.side_by_side(Together((SKIRTS, TYRES), BOTH)) == [
        ("  skirts", "-5.0\u00a0%, look-proof range -6.9\u00a0to\u00a0-3.1\u00a0%"),
        ("  tyres", "+4.0\u00a0%, look-proof range +1.8\u00a0to\u00a0+6.2\u00a0%"),
        ("  all at once", "-1.1\u00a0%, look-proof range -3.4\u00a0to\u00a0+1.3\u00a0%"),
    ]


def test_levels_of_a_graded_part() -> None:
    rows = dict(several.levels(RESPONSE))
    assert rows["  counted from"] == "not fitted"
    assert rows["  least consumption"] == "at level 10.1 (range 8.9 to 11.6)"
    assert rows["  worth trying next"] == "level 10.1, if its maker and the law allow it"
    assert "  level 0" not in rows


def test_a_level_has_the_digits_that_its_range_deserves() -> None:
    wide = dict(several.levels(replace(RESPONSE, best_level=11.32, best_level_interval=(8.354, 12.81))))
    assert wide["  least consumption"] == "at level 11.3 (range 8.4 to 12.8)"
    heavy = dict(several.levels(replace(RESPONSE, best_level=1_134.2, best_level_interval=(905.1, 1_301.0))))
    assert heavy["  least consumption"] == "at level 1134 (range 905 to 1301)"
    pressures = tuple(LevelEffect(level, 0.0, None) for level in (2.2, 2.6, 3.0))
    unbounded = replace(RESPONSE, levels=pressures, best_level=None, best_level_interval=None, next_level=3.4000001)
    assert dict(several.levels(unbounded))["  worth trying next"].startswith("level 3.4, ")


def test_variants_compared() -> None:
    assert "\n".join(line.plain for line in several.compared(FOUND)) == COMPARED
    assert max(len(line.plain) for line in several.compared(FOUND)) <= 80


def test_variants_not_told_apart() -> None:
    open_pairs = tuple(replace(pair, differs=False) for pair in FOUND.pairs)
    assert several.compared(replace(FOUND, pairs=open_pairs))[0].plain.startswith("Not yet: no variant is told")


def test_hostile_names_are_inert() -> None:
    hostile = Together((Effect("a\x1b[31m", 0.0, None, 1.0, 5.0),), BOTH)
    assert "\x1b" not in str(several.side_by_side(hostile))


def test_variants_never_on_together_have_no_row_all_at_once() -> None:
    labels = [label for label, _ in several.side_by_side(Together((SKIRTS, TYRES), None))]
    assert labels == ["  skirts", "  tyres"]


def test_the_first_sentence_is_about_all_parts_that_were_never_apart() -> None:
    both = replace(SHIFTED, modification="skirts", never_apart=("fairing", "tyres"))
    assert answer.sentence(both).startswith("Yes: skirts, fairing and tyres together lowered consumption by")


def test_the_first_sentence_says_that_several_levels_are_averaged() -> None:
    graded = answer.sentence(replace(NOT_YET, response=RESPONSE))
    assert "That is the average over the levels driven (5 and 20);" in graded
    assert graded.endswith("level 5 uses least: -6.1\u00a0%.")  # picked from several: no range of its own
    single = replace(RESPONSE, form="line", best_level=None, best_level_interval=None, levels=RESPONSE.levels[:2])
    assert "average" not in answer.sentence(replace(NOT_YET, response=single))


def test_the_first_sentence_says_which_level_it_is_for() -> None:
    newest = replace(NOT_YET, response=RESPONSE, level=20.0, level_since_km=48_900.0)
    assert answer.sentence(newest).replace("\u00a0", " ").endswith(
        "That is at level 20, driven since 48,900 km; of all driven (5 and 20; see by level), by the fitted curve, "
        "level 5 uses least: -6.1 %."
    )
    again = replace(CONTRADICTED, response=RESPONSE, level=20.0, level_since_km=48_900.0)
    assert advice.next_steps(again, "km")[0].startswith("Look for what else changed")


def test_what_was_settled_on_earlier_levels_sends_to_the_levels() -> None:
    """Not to what else changed: the level did."""
    (step,) = advice.next_steps(replace(CONTRADICTED, response=RESPONSE), "km")
    assert step.endswith("read them one by one, under `by level`.")
    single = replace(RESPONSE, form="line", best_level=None, best_level_interval=None, levels=RESPONSE.levels[:2])
    assert advice.next_steps(replace(CONTRADICTED, response=single), "km")[0].startswith("Look for what else changed")


def test_the_first_sentence_says_against_which_level() -> None:
    """Where there always is a level, as with a tyre pressure, there is no `without`."""
    first, *others = (LevelEffect(level, 7 - 3 * level, (-5.0, 1.0)) for level in (2.2, 2.6, 3.0))
    pressure = replace(RESPONSE, reference_level=2.2, levels=(first, *others))
    said = answer.sentence(replace(SHIFTED, response=pressure))
    assert "over the levels driven (2.6 and 3) against level 2.2;" in said
    two = replace(pressure, levels=(first, others[0]))
    assert "That is level 2.6 against level 2.2." in answer.sentence(replace(SHIFTED, response=two))
