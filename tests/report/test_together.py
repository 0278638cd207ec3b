"""All vehicles as a chapter: who is called, who has no answer, what was fitted to several."""

from __future__ import annotations

from energytrack.inference.fleet.results import (
    BriefAnswer,
    Contribution,
    Deviation,
    FleetAssessment,
    Heterogeneity,
    PooledShift,
    VehicleReview,
)
from energytrack.logbook.records import Vehicle
from energytrack.presentation.report.together import chapter_of

VEHICLES = {name: Vehicle(name, "diesel", "L", 70.0, "km") for name in ("one", "two", "three")}
SKIRTS = BriefAnswer("skirts", "not-yet", 3.0, -2.0, (-5.0, 1.0), 1.2, 12.0, 0.4, 3000.0, 4000.0, 40.0)
POOLED = PooledShift(
    modification="skirts",
    vehicles=(Contribution("one", -2.0, 1.2, 60.0, 12.0), Contribution("two", -4.0, 1.4, 40.0, None)),
    shift_percent=-2.8,
    standard_error_percent=0.9,
    interval_percent=(-6.0, 0.4),
    heterogeneity=Heterogeneity(1.2, 0.27, 17.0, 0.6),
    next_vehicle_percent=None,
    confidence=0.95,
    target_percent=3.0,
    information_fraction=0.5,
    distance_to_go_km=5000.0,
    days_to_go=30.0,
    vehicles_needed=None,
)
FLEET = FleetAssessment(
    month="2026-11",
    confidence=0.95,
    false_discovery_rate=0.05,
    vehicles=(
        VehicleReview("two", "L", 900.0, 90.0, Deviation(0.1, 0.08, 25.0, 4.0, 20.0, 6.2, 1e-6), "", 3e-6, True),
        VehicleReview("one", "L", 1200.0, 96.0, Deviation(0.08, 0.081, -1.2, 4.0, 20.0, -0.3, 0.7), "", 0.7, False,
                      answers=(SKIRTS,)),
        VehicleReview("three", "L", message="no entry in 2026-11"),
    ),
    pooled=(POOLED,),
    distance_km=2100.0,
    energy={"L": 186.0},
)  # fmt: skip


def test_the_called_one_stands_first_and_is_named() -> None:
    chapter = chapter_of(FLEET, VEHICLES)
    assert "November 2026: 3 vehicles" in chapter.lead.replace("\u00a0", " ")
    assert "1 vehicle needs attention: two (+25.0 %)" in chapter.lead.replace("\u00a0", " ")
    (table,) = chapter.sections[0].tables
    assert [row[0] for row in table.rows] == ["two", "one"]
    assert table.rows[0][2:] == ("10.0", "8.00 L/100 km", "+25.0 %, called", "+6.2")
    assert table.rows[1][4] == "-1.2 %"


def test_who_has_no_answer_is_told_why_and_parts_are_pooled() -> None:
    sections = {each.heading: each for each in chapter_of(FLEET, VEHICLES).sections}
    assert sections["Not held against their record"].items == ("three: no entry in 2026-11",)
    (table,) = sections["Fitted to several vehicles"].tables
    assert table.caption.replace("\u00a0", " ") == "skirts, pooled over 2 vehicles"
    said = {label: value.replace("\u00a0", " ") for label, value in table.rows}
    assert said["shift"].startswith("-2.8 %, 95 % range -6.0 to +0.4 %")
    assert said["target 3 %"] == "50 % of the evidence; about 5,000 km more of all together, 30 days"
    assert "Fitted to one vehicle" not in sections
