"""What a shift is worth: at the vehicle's own price of energy and its own distance in a year."""

from __future__ import annotations

import datetime as dt
import math

from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.inference.results import Assessment
from energytrack.inference.review.driven import Account, pieces
from energytrack.inference.review.results import Price, Worth

YEAR_DAYS = 365
FEWEST_DAYS = 60  # of log, from which a year's distance may be scaled


def price_of(accounted: Account, both: TwoCarriers | None) -> tuple[Price | None, str | None]:
    """Price, consumption as measured and yearly distance over the last 365 days of the log, or why there is none."""
    if accounted.mixed is not None:
        return None, f"costs in several currencies are not added up ({accounted.mixed})"
    bought = accounted.bought(both)
    last = bought[-1][0]
    since = max(bought[0][0], last - YEAR_DAYS)
    priced = [entry for day, entry in bought
              if day > since and entry.cost is not None and 0 < entry.energy < math.inf]  # fmt: skip
    if not priced:
        return None, "no entry of the last 12 months has a cost: log it with --cost"
    if last - since < FEWEST_DAYS:
        return None, f"the log covers {last - since} days: a year's distance can be told from {FEWEST_DAYS} on"
    per_unit = math.fsum(entry.cost or 0.0 for entry in priced) / math.fsum(entry.energy for entry in priced)
    driven = math.fsum(km * _share(start, end, since, last) for start, end, km in pieces(accounted.log))
    yearly = driven * YEAR_DAYS / (last - since)
    measured = [each for each in accounted.log.segments if each.end_day > since]
    if not measured:
        return None, "no consumption is known of the last 12 months"
    consumption = math.fsum(each.energy for each in measured) / math.fsum(each.distance_km for each in measured)
    day = dt.date.fromordinal(since).isoformat()
    scaled = last - since < YEAR_DAYS
    cost = yearly * consumption * per_unit
    return Price(accounted.currency, per_unit, consumption, yearly, cost, day, scaled), None


def _share(start: int, end: int, since: int, last: int) -> float:
    """Share of driving between two days that falls into the time counted."""
    if start >= end:
        return 1.0 if since < end <= last else 0.0
    return max(0.0, min(end, last) - max(start, since)) / (end - start)


def worth(answer: Assessment, price: Price, both: TwoCarriers | None, part_cost: float | None) -> Worth | None:
    """Of one modification; None while there is no shift to speak of.

    The shift is relative to consumption without it at the reference conditions. With tank and battery those are driving
    on fuel alone, and the same shift holds for whatever mix was bought: there it is relative to that.
    """
    if answer.shift_percent is None or answer.expectation is None:
        return None
    usual = answer.expectation.consumption if both is None else price.consumption
    per_km = usual * price.per_unit / 100  # cost of one percent
    low, high = answer.interval_percent or (-math.inf, math.inf)
    saved = (-high * per_km, -low * per_km)  # a km, at least and at most
    bounded = all(map(math.isfinite, saved))
    resolved = answer.verdict == "shifted" and bounded and saved[0] * saved[1] > 0
    pays = resolved and saved[0] > 0 and part_cost is not None
    return Worth(
        yearly=-answer.shift_percent * per_km * price.yearly_km,
        interval=(saved[0] * price.yearly_km, saved[1] * price.yearly_km) if bounded else None,
        resolved=resolved,
        part_cost=part_cost,
        payback_km=part_cost / (-answer.shift_percent * per_km) if pays and part_cost is not None else None,
        payback_interval_km=(part_cost / saved[1], part_cost / saved[0]) if pays and part_cost is not None else None,
    )
