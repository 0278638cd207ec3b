"""Answers of every verdict, written out by hand: rendering needs no log and no fit."""

from __future__ import annotations

from dataclasses import replace

from energytrack.inference.results import Assessment, Covariate, Design, Expectation, Look, Noise, Plan, Remedy

NOISE = Noise(trip_percent=3.1, level_error=0.61, drift_weeks_percent=0.9, drift_seasons_percent=0.6)
COVARIATES = {
    "heating": Covariate(0.61, 0.08, -8.5, 4.0, 18.4, "temperature_c"),
    "speed": Covariate(0.31, 0.12, 6.4, 71.0, 92.0, "speed_kmh"),
}
EXPECTATION = Expectation(
    consumption=0.0824,
    shift_percent=-2.1,
    sd_percent=4.0,
    terms={"heating": 0.61, "speed": 0.31},
    centres={"heating": 6.0, "speed": 82.0},
)
LOOKS = (
    Look(49_310.0, "2026-03-02", 0.03, 1.2, None, None),
    Look(49_742.0, "2026-03-09", 0.14, -3.9, (-20.6, 12.8), 5.99),
    Look(50_180.0, "2026-03-16", 0.25, -1.4, (-10.7, 7.9), 4.48),
    Look(50_611.0, "2026-03-23", 0.45, -2.6, (-7.8, 2.6), 3.34),
    Look(50_880.0, "2026-03-30", 0.83, -2.1, (-4.9, 0.7), 2.46),
)

NOT_YET = Assessment(
    vehicle="van",
    modification="side skirts",
    unit="L",
    verdict="not-yet",
    shift_percent=-2.1,
    interval_percent=(-4.9, 0.7),
    standard_error_percent=1.14,
    degrees_of_freedom=13.4,
    confidence=0.95,
    power=0.80,
    target_percent=3.0,
    information_fraction=0.836,
    distance_baseline_km=6420.0,
    distance_modified_km=1980.0,
    segments_baseline=14,
    segments_modified=5,
    distance_needed_km=3841.0,
    distance_to_go_km=1861.0,
    distance_to_go_interval_km=(1120.0, 3390.0),
    days_to_go=12.3,
    distance_expected_km=2904.0,
    settled_at_km=None,
    settled_on=None,
    resolvable_now_percent=3.28,
    resolvable_at_best_percent=1.9,
    noise=NOISE,
    covariates=COVARIATES,
    looks=LOOKS,
    remedies=(),
    expectation=EXPECTATION,
    warnings=("temperatures of 2 of 19 segments were not logged and are filled in from this vehicle's own record",),
)

SHIFTED = replace(
    NOT_YET,
    verdict="shifted",
    shift_percent=-5.8,
    interval_percent=(-8.2, -3.4),
    standard_error_percent=1.06,
    information_fraction=0.97,
    resolvable_now_percent=3.05,
    distance_needed_km=2310.0,
    distance_to_go_km=0.0,
    distance_to_go_interval_km=(0.0, 0.0),
    days_to_go=0.0,
    distance_expected_km=None,
    settled_at_km=51_230.0,
    settled_on="2026-04-06",
    resolvable_at_best_percent=None,
    looks=(*LOOKS, Look(51_230.0, "2026-04-06", 0.97, -5.8, (-8.2, -3.4), 2.28)),
    warnings=(),
)

RAISED = replace(SHIFTED, modification="roof rack", shift_percent=4.1, interval_percent=(1.7, 6.5), looks=())

CONTRADICTED = replace(
    SHIFTED,
    shift_percent=-0.9,
    interval_percent=(-3.0, 1.2),
    standard_error_percent=0.94,
    information_fraction=1.0,
    looks=(*SHIFTED.looks, Look(53_940.0, "2026-05-18", 1.0, -0.9, (-3.0, 1.2), 2.24)),
)

NO_SHIFT = replace(
    NOT_YET,
    verdict="no-shift-of-target-size",
    shift_percent=-0.4,
    interval_percent=(-2.7, 1.9),
    standard_error_percent=1.04,
    resolvable_now_percent=3.0,
    information_fraction=1.0,
    distance_modified_km=6204.0,
    segments_modified=15,
    distance_to_go_km=0.0,
    distance_to_go_interval_km=(0.0, 0.0),
    days_to_go=0.0,
    distance_expected_km=None,
    settled_at_km=55_110.0,
    settled_on="2026-06-30",
    resolvable_at_best_percent=None,
    warnings=(),
)

OUT_OF_REACH = replace(
    NOT_YET,
    verdict="out-of-reach",
    information_fraction=0.40,
    interval_percent=(-7.9, 3.7),
    standard_error_percent=1.65,
    resolvable_now_percent=4.74,
    looks=LOOKS[:3],
    distance_needed_km=None,
    distance_to_go_km=None,
    distance_to_go_interval_km=None,
    days_to_go=None,
    distance_expected_km=None,
    resolvable_at_best_percent=4.1,
    remedies=(
        Remedy("larger-target", "5 %", 5.0, 3140.0),
        Remedy("alternate", "every 2 fill-ups", 3.0, 5420.0),
        Remedy("longer-baseline", "20 fill-ups without it first", 3.0, 14_600.0),
    ),
    warnings=("temperatures hardly overlap: -2 to 9 °C without the modification, 11 to 24 °C with it.",),
)

NO_BASELINE = replace(
    NOT_YET,
    verdict="no-baseline",
    shift_percent=None,
    interval_percent=None,
    standard_error_percent=None,
    degrees_of_freedom=None,
    information_fraction=None,
    distance_baseline_km=812.0,
    distance_modified_km=1980.0,
    segments_baseline=2,
    distance_needed_km=None,
    distance_to_go_km=None,
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

UNCLEAR = replace(NO_SHIFT, verdict="closed-unclear", shift_percent=-1.8, interval_percent=(-4.1, 0.5))

EVERY_VERDICT = {
    "shifted": SHIFTED,
    "raised": RAISED,
    "contradicted": CONTRADICTED,
    "no-shift": NO_SHIFT,
    "not-yet": NOT_YET,
    "out-of-reach": OUT_OF_REACH,
    "no-baseline": NO_BASELINE,
    "unclear": UNCLEAR,
}

PLAN = Plan(
    vehicle="van",
    unit="L",
    target_percent=3.0,
    confidence=0.95,
    power=0.80,
    distance_baseline_km=8423.0,
    segments_baseline=19,
    noise=NOISE,
    designs=(
        Design(
            "one-switch", None, 1, 12_420.0, (8100.0, None), 81.0,
            {"1000": 8.42, "2500": 5.61, "5000": 4.2, "10000": 3.31},
            costliest="drift-weeks", costliest_share=0.62, cost_shares={"drift-weeks": 0.62, "temperature_c": 0.31},
        ),
        Design(
            "alternate", 1, 24, 5104.0, (4010.0, 7220.0), 33.2,
            {"1000": 6.9, "2500": 4.3, "5000": 3.03, "10000": 2.15},
            costliest="filling", costliest_share=0.48, cost_shares={"filling": 0.48, "temperature_c": 0.03},
        ),
        Design(
            "alternate", 2, 13, 5320.0, (4100.0, 7600.0), 34.9,
            {"1000": None, "2500": 4.4, "5000": 3.1, "10000": 2.2},
            costliest="trip", costliest_share=0.71, cost_shares={"trip": 0.71},
        ),
        Design("alternate", 4, None, None, None, None, {"1000": 9.1, "2500": 6.4, "5000": 5.2, "10000": 4.4}),
    ),
    warnings=(),
)  # fmt: skip
