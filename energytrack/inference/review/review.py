"""One vehicle's month: what was driven, used and paid, and whether consumption moved once conditions are taken out."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from energytrack.consumption.emissions import check_stated
from energytrack.consumption.frames import (
    MODIFICATION_COLUMNS,
    entries_to_frame,
    events_from_frame,
    modifications_from_frame,
    observe_log,
    records_to_frame,
    weather_from_frame,
)
from energytrack.consumption.oddities import set_aside as sort_out
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference.assess import assess
from energytrack.inference.graded import averaged
from energytrack.inference.model import fit_model
from energytrack.inference.results import Assessment, Range, SetAside
from energytrack.inference.review.carbon import carbon_of
from energytrack.inference.review.changes import changes
from energytrack.inference.review.cut import check_month, entries_until, fitted_until
from energytrack.inference.review.driven import Account, account, driven, month_shares
from energytrack.inference.review.levels import FEWEST, FEWEST_OUTSIDE, Estimate, Months
from energytrack.inference.review.money import price_of, worth
from energytrack.inference.review.month import Month, month_of, month_with
from energytrack.inference.review.quality import quality_of
from energytrack.inference.review.results import Difference, Driven, Level, Price, Review, UnderTest
from energytrack.inference.suspects import suspects
from energytrack.logbook.records import Event, Modification, Vehicle

if TYPE_CHECKING:
    import pandas as pd

MONTHS = 13  # shown: this one, and back to the same month a year ago


@dataclass(frozen=True)
class _Asked:
    """What a review is asked, and the tables as far as the month is concerned, ready for `assess`."""

    vehicle: str
    carrier: str
    month: Month
    confidence: float
    tables: Mapping[str, Any]
    rows: Sequence[Modification]
    events: Sequence[Event]
    both: TwoCarriers | None
    targets: Mapping[str, float]
    part_costs: Mapping[str, float]
    typist: Vehicle


@dataclass(frozen=True)
class _Log:
    """The log until the month's end, measured."""

    segmented: SegmentedLog
    accounted: Account
    months: Months | None  # None: too short for a fit
    note: str | None
    odd: tuple[SetAside, ...]
    notes: tuple[str, ...]
    kept: Any = field(repr=False)  # Observations


def review(
    entries: pd.DataFrame,
    modifications: pd.DataFrame | None = None,
    *,
    month: str | None = None,
    carrier: str = "petrol",
    capacity: float | None = None,
    unit: str = "L",
    weather: pd.DataFrame | None = None,
    events: pd.DataFrame | None = None,
    two_carriers: TwoCarriers | None = None,
    confidence: float = 0.95,
    co2_kg_per_unit: Mapping[str, float] | None = None,
    part_costs: Mapping[str, float] | None = None,
    typed_in: tuple[str, str | None] = ("km", None),
    today: dt.date | None = None,
) -> Review:
    """Review one vehicle's month, by the log up to the end of that month.

    Tables, `capacity`, `unit`, `two_carriers` and `typed_in` as for `assess`. `month`: YYYY-MM, that of the newest
    entry if left out. `carrier` is what the vehicle runs on where it has one carrier. `co2_kg_per_unit`: carrier -> kg
    of CO2 per L, kg or kWh, in the place of the table's; electricity has none unless it is stated. `part_costs`:
    modification -> what it cost, in the currency of the log.

    Raises InferenceError for a month that is misspelled, has not begun or has no entry; UnknownNameError for the cost
    of a modification that is not logged; ConsumptionError for tables that cannot be read or a factor below 0.
    """
    stated = dict(co2_kg_per_unit or {})
    check_stated(stated)
    _check(confidence)
    asked = _asked(
        entries,
        modifications,
        month=month,
        carrier=carrier,
        confidence=confidence,
        own={"capacity": capacity, "unit": unit, "weather": weather, "events": events, "two_carriers": two_carriers},
        part_costs=dict(part_costs or {}),
        typed_in=typed_in,
        today=today or dt.date.today(),
    )
    log = _log(asked)
    this, before, ago = (_driven(log, asked, asked.month.later(-back)) for back in (0, 1, 12))
    assert this is not None  # the month has entries
    level, differences = _compared(log, asked, this, before, ago)
    price, why_not = price_of(log.accounted, asked.both)
    return Review(
        vehicle=asked.vehicle,
        month=str(asked.month),
        unit=log.segmented.unit,
        confidence=confidence,
        counted_until=_counted_until(log, asked.month),
        this=this,
        month_before=before,
        year_ago=ago,
        level=level,
        level_note=log.note if level is None else None,
        differences=differences,
        levels=_levels(log, asked),
        reference_conditions={} if log.months is None else log.months.reference_conditions(),
        carbon=carbon_of(carrier, this, log.segmented, asked.month, asked.both, stated),
        price=price,
        price_note=why_not,
        modifications=tuple(_tested(asked, name, price) for name in asked.targets),
        regimes=changes(log.kept, asked.month, asked.rows, asked.events, confidence),
        set_aside=tuple(each for each in log.odd if each.date[:7] == str(asked.month)),
        quality=quality_of(log.segmented, asked.month, this, _weather(asked)),
        warnings=log.notes,
    )


def _asked(
    entries: pd.DataFrame,
    modifications: pd.DataFrame | None,
    *,
    month: str | None,
    carrier: str,
    confidence: float,
    own: dict[str, Any],
    part_costs: Mapping[str, float],
    typed_in: tuple[str, str | None],
    today: dt.date,
) -> _Asked:
    """The question, with the tables cut at the month's end."""
    wanted = None if month is None else month_of(month)
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    if not len(entries):
        raise InferenceError("there is no entry yet: log the next full tank or charge")
    _, _, whole = observe_log(entries, None, **own)
    wanted = wanted or month_with(dt.date.fromordinal(max(whole.days)))
    check_month(whole, wanted, vehicle, today)
    every = [] if modifications is None else modifications_from_frame(modifications, vehicle or None)
    _check_parts(part_costs, every)
    kept = entries_until(whole, wanted)
    rows = fitted_until(every, kept, wanted)
    targets: dict[str, float] = {}
    for row in rows:
        targets[row.name] = targets.get(row.name, 3.0) if row.target_percent is None else row.target_percent
    tables = {
        "entries": entries_to_frame(kept),
        "modifications": records_to_frame(rows, MODIFICATION_COLUMNS),
        **own,
    }
    happened = [] if own["events"] is None else events_from_frame(own["events"], vehicle or None)
    typist = Vehicle(vehicle, carrier, own["unit"], own["capacity"], typed_in[0], typed_unit=typed_in[1])
    return _Asked(
        vehicle, carrier, wanted, confidence, tables, rows, happened, own["two_carriers"], targets, part_costs, typist
    )


def _log(asked: _Asked) -> _Log:
    observed, notes, segmented = observe_log(**asked.tables)
    names = [str(asked.month.later(-back)) for back in range(MONTHS)]
    for name in names:
        observed = observed.adding(name, np.array(month_shares(segmented, month_of(name))))
    found = sort_out(observed)
    shares = {name: found.kept.shares[:, found.kept.names.index(name)] for name in names}
    kept = found.kept.leaving_out(names)
    odd = suspects(segmented, found, asked.typist, as_typed=asked.both is None)
    months, note = None, None
    if len(kept) < FEWEST:
        note = _too_short(len(kept), segmented)
    elif not shares[names[0]].any():
        note = "none of the month's driving lies between known levels that are kept"
    elif (1 - shares[names[0]]).sum() < FEWEST_OUTSIDE:
        note = f"{FEWEST_OUTSIDE} full tanks or charges outside this month are needed to tell what weather and speed do"
    else:
        months = Months(fit_model(averaged(kept), None), shares, asked.confidence)
    return _Log(segmented, account(segmented), months, note, odd, notes, kept)


def _counted_until(log: _Log, month: Month) -> str | None:
    last = log.segmented.days[-1]
    return dt.date.fromordinal(last).isoformat() if last < month.last else None


def _too_short(count: int, segmented: SegmentedLog) -> str:
    if segmented.lacks_levels:
        return "no two entries tell how full the tank or battery was after them, so no consumption is known"
    return (
        f"weather and speed can be taken out from {FEWEST} full tanks or charges on, {FEWEST_OUTSIDE} of them outside "
        f"this month; {count} so far"
    )


def _driven(log: _Log, asked: _Asked, month: Month) -> Driven | None:
    found = driven(log.accounted, month, asked.both)
    return found if found.entries or found.distance_km > 0 else None


def _compared(
    log: _Log, asked: _Asked, this: Driven, before: Driven | None, ago: Driven | None
) -> tuple[Level | None, tuple[Difference, ...]]:
    """The month's level, and what it differs by from two others and the baseline."""
    level = _level(log, str(asked.month))
    if log.months is None or level is None:
        return None, ()
    others: tuple[tuple[Literal["month-before", "year-ago", "baseline"], str | None, str, float | None], ...] = (
        ("month-before", before.month if before else "", "", before.consumption if before else None),
        ("year-ago", ago.month if ago else "", "", ago.consumption if ago else None),
        ("baseline", None, _baseline(log), _usual(log, str(asked.month))),
    )
    found = []
    for against, other, what, consumption in others:
        answer = None if other == "" else log.months.difference(str(asked.month), other)
        if answer is None:
            continue
        estimate, reference = answer
        both = this.consumption is not None and consumption is not None
        found.append(
            Difference(
                against=against,
                what=what or str(other),
                reference=reference,
                percent=100 * estimate.value,
                interval_percent=_percent(estimate),
                degrees_of_freedom=estimate.freedom,
                measured_percent=100 * (this.consumption / consumption - 1) if both else None,  # type: ignore[operator]
            )
        )
    return level, tuple(found)


def _baseline(log: _Log) -> str:
    assert log.months is not None
    if log.months.model.others:
        return "all driving before this month, nothing fitted"
    return "all driving before this month"


def _usual(log: _Log, month: str) -> float | None:
    """Consumption of the baseline as measured: segments wholly outside the month, nothing fitted."""
    assert log.months is not None
    bare = (log.months.shares[month] == 0) & ~log.kept.fitted.any(axis=1)
    return float(log.kept.energy[bare].sum() / log.kept.distance_km[bare].sum()) if bare.any() else None


def _percent(estimate: Estimate) -> Range | None:
    return None if estimate.interval is None else (100 * estimate.interval[0], 100 * estimate.interval[1])


def _level(log: _Log, month: str) -> Level | None:
    found = None if log.months is None else log.months.level(month)
    if found is None or log.months is None:
        return None
    distance = float(log.months.model.observed.distance_km @ log.months.shares[month])
    return Level(month, found.value, found.interval, distance)


def _levels(log: _Log, asked: _Asked) -> tuple[Level, ...]:
    every = (_level(log, str(asked.month.later(-back))) for back in range(MONTHS - 1, -1, -1))
    return tuple(level for level in every if level is not None)


def _tested(asked: _Asked, name: str, price: Price | None) -> UnderTest:
    answer: Assessment = assess(
        **asked.tables,
        name=name,
        target_percent=asked.targets[name],
        confidence=asked.confidence,
        typed_in=(asked.typist.distance_unit, asked.typist.typed_unit),
    )
    return UnderTest(
        name=name,
        verdict=answer.verdict,
        withheld=answer.withheld,
        target_percent=answer.target_percent,
        shift_percent=answer.shift_percent,
        interval_percent=answer.interval_percent,
        information_fraction=answer.information_fraction,
        distance_modified_km=answer.distance_modified_km,
        distance_to_go_km=answer.distance_to_go_km,
        days_to_go=answer.days_to_go,
        settled_on=answer.settled_on,
        is_open=answer.is_open,
        worth=None if price is None else worth(answer, price, asked.both, asked.part_costs.get(name)),
    )


def _weather(asked: _Asked) -> list[Any]:
    table = asked.tables["weather"]
    return [] if table is None else weather_from_frame(table)


def _check(confidence: float) -> None:
    if not 0.5 <= confidence < 1:
        raise InferenceError(f"confidence must lie between 0.5 and 1, not {confidence:g}: 0.95 is usual")


def _check_parts(costs: Mapping[str, float], rows: Sequence[Modification]) -> None:
    names = list(dict.fromkeys(row.name for row in rows))
    for name, cost in costs.items():
        if name not in names:
            raise UnknownNameError(f"no modification named {name!r}; logged: {', '.join(names) or 'none'}")
        if not 0 < cost < float("inf"):
            raise InferenceError(f"the cost of {name!r} must be more than 0, not {cost:g}")
