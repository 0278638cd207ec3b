"""CO2 of a month, by carrier."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from energytrack.consumption.emissions import factor_of
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.inference.review.driven import each_carrier
from energytrack.inference.review.month import Month
from energytrack.inference.review.results import Carbon, Driven
from energytrack.logbook.records import UNIT_OF_CARRIER


def carbon_of(
    carrier: str,
    this: Driven,
    log: SegmentedLog,
    month: Month,
    both: TwoCarriers | None,
    stated: Mapping[str, float],
) -> tuple[Carbon, ...]:
    """From the energy used over the whole distance of the month; () where its consumption is unknown.

    stated: kg per unit of a carrier, in the place of the table's.
    """
    if this.energy is None:
        return ()
    if both is None:
        return (_of(carrier, this.energy, log.unit, stated),)
    whole = this.distance_km / this.measured_km
    fuel, electric = each_carrier(log, month, both)
    return (
        _of(both.fuel, fuel * whole, UNIT_OF_CARRIER[both.fuel], stated),
        _of("electricity", electric * whole, "kWh", stated),
    )


def _of(carrier: str, energy: float, unit: str, stated: Mapping[str, float]) -> Carbon:
    factor = factor_of(carrier, stated) if unit == UNIT_OF_CARRIER[carrier] or carrier in stated else None
    if factor is None:
        return Carbon(carrier, energy, unit, None, None, None)
    return Carbon(carrier, energy, unit, energy * factor.kg, factor.kg, factor.source)


def total(carbon: Sequence[Carbon]) -> float | None:
    """kg over all carriers; None where one of them has no factor."""
    known = [each.kg for each in carbon if each.kg is not None]
    return sum(known) if known and len(known) == len(carbon) else None
