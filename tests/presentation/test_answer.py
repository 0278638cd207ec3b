"""The sentence that answers first."""

from __future__ import annotations

from dataclasses import replace

from energytrack.inference.results import Assessment, Look, Remedy
from energytrack.presentation.answer import sentence
from tests.presentation.samples import (
    CONTRADICTED,
    LOOKS,
    NO_BASELINE,
    NO_SHIFT,
    NOT_YET,
    OUT_OF_REACH,
    RAISED,
    SHIFTED,
    UNCLEAR,
)


def said(a: Assessment, unit: str = "km") -> str:
    return sentence(a, unit).replace("\u00a0", " ")


def test_a_saving_is_said_as_lowered() -> None:
    assert said(SHIFTED) == (
        "Yes: side skirts lowered consumption by 5.8 % (look-proof range 3.4 to 8.2 %), "
        "settled on 2026-04-06 at 51,230 km."
    )


def test_a_rise_is_said_as_raised() -> None:
    assert said(RAISED) == (
        "Yes: roof rack raised consumption by 4.1 % (range 1.7 to 6.5 %), "
        "settled on 2026-04-06 at 51,230 km."
    )


def test_not_yet_says_how_far_and_how_long() -> None:
    assert said(NOT_YET) == (
        "Not yet: about 1,900 km more with side skirts, about 12 days of your driving, at the target of 3 %. "
        "So far -2.1 %, look-proof range -4.9 to +0.7 %."
    )


def test_a_range_is_look_proof_up_to_the_look_that_closed_the_test() -> None:
    at_closing = replace(NO_SHIFT, looks=(*LOOKS, Look(55_110.0, "2026-06-30", 1.0, -0.4, (-2.7, 1.9), 2.24)))
    assert "Measured -0.4 %, look-proof range -2.7 to +1.9 %" in said(at_closing)
    later = (*at_closing.looks, Look(55_600.0, "2026-07-07", 1.0, -0.4, (-2.7, 1.9), 2.24))
    assert "Measured -0.4 %, range -2.7 to +1.9 %" in said(replace(at_closing, looks=later))
    ruled_out_later = replace(at_closing, looks=later, settled_at_km=55_600.0)
    assert "Measured -0.4 %, range" in said(ruled_out_later)
    assert "Measured -0.4 %, range" in said(replace(UNCLEAR, shift_percent=-0.4, looks=later))
    assert "lowered consumption by 5.8 % (range 3.4 to 8.2 %)" in said(replace(SHIFTED, looks=later))


def test_miles_for_who_counts_miles() -> None:
    # 1,861 km = 1,156.4 mi, 51,230 km = 31,832.8 mi at 1.609344 km a mile (NIST SP 811)
    assert "about 1,200 mi more" in said(NOT_YET, "mi")
    assert "at 31,833 mi" in said(SHIFTED, "mi")


def test_a_distance_ahead_has_a_third_digit_only_where_its_range_is_narrow() -> None:
    """1,861 km: within 30 % either way three digits, else two."""
    ranges = {(1500.0, 2500.0): "1,860", (1120.0, 3390.0): "1,900", (1500.0, None): "1,900"}
    for interval, shown in ranges.items():
        assert f"about {shown} km more" in said(replace(NOT_YET, distance_to_go_interval_km=interval))
    assert "about 1,900 km more" in said(replace(NOT_YET, distance_to_go_interval_km=None))


def test_two_decimals_only_where_the_error_allows() -> None:
    a = replace(SHIFTED, shift_percent=-1.234, interval_percent=(-1.412, -1.056), standard_error_percent=0.08)
    assert "by 1.23 % (look-proof range 1.06 to 1.41 %)" in said(a)
    assert "by 1.2 % (look-proof range 1.1 to 1.4 %)" in said(replace(a, standard_error_percent=0.1))


def test_no_minus_before_nothing() -> None:
    assert "Measured 0.0 %" in said(replace(NO_SHIFT, shift_percent=-0.04))


def test_a_settled_shift_that_later_driving_contradicts() -> None:
    assert said(CONTRADICTED) == (
        "Doubtful: a shift of -5.8 % from side skirts was settled on 2026-04-06 at 51,230 km, "
        "but with what was driven since its "
        "range reaches zero again: now -0.9 %, range -3.0 to +1.2 %."
    )
    turned = replace(SHIFTED, shift_percent=4.0, interval_percent=(1.0, 7.0))
    assert "with what was driven since it points the other way: now +4.0 %" in said(turned)


def test_a_shift_ruled_out_that_later_driving_shows() -> None:
    a = replace(NO_SHIFT, shift_percent=-4.4, interval_percent=(-5.6, -3.2))
    assert said(a) == (
        "Doubtful: a shift of 3 % from side skirts was ruled out on 2026-06-30 at 55,110 km, "
        "but what was driven since shows one: "
        "now -4.4 %, range -5.6 to -3.2 %."
    )


def test_a_known_change_that_was_seen_says_what_the_log_can_show() -> None:
    a = replace(RAISED, known_percent=(2.0, 5.0), known_change="seen")
    assert said(a).endswith(
        "A known change, +2 to +5 % expected, was seen: this log can show a shift of 3.0 % or more now."
    ) or said(a).endswith("this log can show a shift of 3.1 % or more now.")  # 3.05 as a binary fraction


def test_a_known_change_that_was_not_seen_warns_of_smaller_ones() -> None:
    otherwise = replace(SHIFTED, known_percent=(4.0, 9.0), known_change="seen-otherwise")
    assert "not the known change, +4 to +9 % expected: smaller shifts from this log are not to be" in said(otherwise)
    open_ = replace(NOT_YET, known_percent=(4.0, 9.0), known_change="not-seen-yet")
    assert said(open_).endswith(
        "The known change, +4 to +9 % expected, has not been seen yet: this log can only show a shift of 3.3 % or "
        "more now."
    )
    assert "has not been seen:" in said(replace(NO_SHIFT, known_percent=(4.0, 9.0), known_change="not-seen-yet"))
    assert said(replace(NO_BASELINE, known_percent=(4.0, 9.0), known_change="not-seen-yet")).endswith("seen yet.")


def test_an_open_ended_watch_goes_on_past_the_distance_needed() -> None:
    a = replace(NOT_YET, rule="open-ended", distance_to_go_km=0.0, days_to_go=0.0)
    assert said(a).startswith(
        "Not yet: the distance for a shift from side skirts is driven, none has shown, the watch goes on, at the "
        "target of 3 %."
    )


def test_a_shift_ruled_out_whose_range_has_grown_past_the_target() -> None:
    """The sentence must not call smaller than 3 % what may be 3.3 %."""
    a = replace(NO_SHIFT, shift_percent=0.9, interval_percent=(-1.5, 3.3))
    assert said(a) == (
        "No: a shift of 3 % from side skirts was ruled out on 2026-06-30 at 55,110 km. "
        "Measured now +0.9 %, range "
        "-1.5 to +3.3 %, which reaches past the target again."
    )


def test_out_of_reach_says_what_would_do_and_keeps_the_target_where_it_can() -> None:
    assert "Within reach: take it off and on every 2 fill-ups, about 5,400 km more for 3 %." in said(OUT_OF_REACH)
    larger = (Remedy("larger-target", "5 %", 5.0, 3140.0),)
    only_larger = replace(OUT_OF_REACH, remedies=larger)
    assert "Within reach: be content with a target of 5 %, about 3,100 km more." in said(only_larger)
    assert "Within reach" not in said(replace(OUT_OF_REACH, remedies=()))


def test_no_baseline_says_what_is_missing_and_how_far_to_drive() -> None:
    # four working weeks of a 160 km commute are 3,200 km (common practice, no source); 812 km are there
    assert said(NO_BASELINE) == (
        "No baseline: there is only 812 km in 2 segments without side skirts, too little to compare with. "
        "Drive about 2,390 km without it, then ask again."
    )
    nothing = replace(NO_BASELINE, distance_baseline_km=0.0, segments_baseline=0)
    assert "there is nothing measured without side skirts" in said(nothing)
    assert "Drive about 1,500 km" in said(replace(NO_BASELINE, distance_to_go_km=1500.0))


def test_without_known_levels_it_says_what_to_enter_and_not_to_drive_more() -> None:
    unknown = replace(NO_BASELINE, levels_known=False, segments_baseline=0, segments_modified=0)
    assert said(unknown) == (
        "No baseline: nothing can be measured, as no two entries tell how full the tank or battery was after them. "
        "Log the level with each entry (--level 80), or fill or charge to full (no --partial)."
    )
