"""Reports of changes, written out by hand: rendering needs no log and no fit."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

from energytrack.inference.regimes.results import Break, BreakTest, Criterion, Match, Point, Regime, RegimeReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation.regimes.marks import Mark

VAN = Vehicle("van", "diesel", "L", 70.0)
IN_MILES = replace(VAN, distance_unit="mi", display="mpg-us")
FIRST_KM, LAST_KM, EACH_KM = 40_000.0, 60_000.0, 500.0
LEVELS = ((48_900.0, 0.092), (55_000.0, 0.087), (LAST_KM, 0.095))  # up to here, at this consumption


def consumption_at(km: float) -> float:
    return next(level for end, level in LEVELS if km <= end)


def points(count: int) -> tuple[Point, ...]:
    """Equal segments, 3 % above and below their regime's level in turns."""
    length = (LAST_KM - FIRST_KM) / count
    found = []
    for number in range(count):
        start, end = FIRST_KM + number * length, FIRST_KM + (number + 1) * length
        day = dt.date(2025, 1, 1) + dt.timedelta(days=round(300 * number / count))
        level = consumption_at((start + end) / 2) * (1.03 if number % 2 else 0.97)
        found.append(Point(start, end, day.isoformat(), level))
    return tuple(found)


EXPLAINED = Break(
    odometer_km=48_900.0,
    date="2025-05-14",
    interval_km=(48_200.0, 49_900.0),
    interval_dates=("2025-05-03", "2025-05-29"),
    shift_percent=-5.43,
    interval_percent=(-7.2, -3.7),
    p_value=0.00004,
    explained_by="side skirts",
    matches=(Match("side skirts", "fitted", 48_900.0, "2025-05-14"), Match("service", "event", None, "2025-05-20")),
    explanation="side skirts fitted at 48,900 km, inside the break's range 48,200-49,900 km: agrees; so does service",
    suspects=(),
    caution=None,
)
UNEXPLAINED = Break(
    odometer_km=55_000.0,
    date="2025-08-14",
    interval_km=(54_300.0, 55_900.0),
    interval_dates=("2025-08-03", "2025-08-28"),
    shift_percent=9.2,
    interval_percent=(6.1, 12.4),
    p_value=0.012,
    explained_by=None,
    matches=(),
    explanation="unexplained: nothing was logged from 54,300 to 55,900 km (2025-08-03 to 2025-08-28)",
    suspects=("brakes: one that drags makes a wheel hot", "tyres: pressure lost, or another set put on"),
    caution="A sudden unexplained rise: have brakes, tyres and leaks inspected by a qualified person.",
)
TWICE = RegimeReport(
    vehicle="van",
    unit="L",
    confidence=0.95,
    statistic=31.2,
    p_value=0.00004,
    p_value_asymptotic=0.00001,
    decided_by="sequential sup-F tests (BIC agrees)",
    breaks=(EXPLAINED, UNEXPLAINED),
    regimes=(
        Regime(40_000.0, 48_900.0, "2025-01-01", "2025-05-14", 18, 0.092, (0.0910, 0.0930)),
        Regime(48_900.0, 55_000.0, "2025-05-14", "2025-08-14", 12, 0.087, (0.0858, 0.0882)),
        Regime(55_000.0, 60_000.0, "2025-08-14", "2025-10-28", 10, 0.095, (0.0937, 0.0963)),
    ),
    tests=(BreakTest(0, 1, 31.2, 0.00004), BreakTest(1, 1, 19.4, 0.012), BreakTest(2, 1, 4.1, 0.61)),
    criteria=(Criterion(0, 80.0, 160.2, 170.1), Criterion(1, 52.0, 141.7, 155.9), Criterion(2, 36.0, 133.0, 151.2)),
    points=points(40),
    judged_km=(43_000.0, 57_000.0),
    later_km=3_000.0,
    note=None,
    warnings=("1 span between known levels set aside: missed entry (1)",),
)
ONCE = replace(TWICE, breaks=TWICE.breaks[:1])
NONE = replace(
    TWICE,
    breaks=(),
    regimes=(Regime(40_000.0, 60_000.0, "2025-01-01", "2025-10-28", 40, 0.0915, (0.0905, 0.0925)),),
)
TOO_FEW = replace(
    NONE, statistic=None, p_value=None, p_value_asymptotic=None, decided_by=None, regimes=(), tests=(), criteria=(),
    points=(), judged_km=None, later_km=None, warnings=(),
    note="7 segments between known levels are too few to look for a change: 12 are needed, 5 more fill-ups to the "
    "full mark or readings, about 2,800 km",
)  # fmt: skip
MARKS = (Mark("side skirts fitted", 48_900.0), Mark("service", 49_100.0), Mark("tow bar removed", 58_000.0))
