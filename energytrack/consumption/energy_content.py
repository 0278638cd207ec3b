"""How much energy one unit of each carrier holds: lower heating values from named public sources.

All figures are written down from memory of the documents named beside them. A blend differs by season and country, and
by a few percent; a better figure for the fuel really bought may be given instead.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType
from typing import NamedTuple

from energytrack.errors import ConsumptionError
from energytrack.logbook.quantities import MJ_PER_KWH
from energytrack.logbook.records import UNIT_OF_CARRIER

_DIRECTIVE = "Directive (EU) 2018/2001, Annex III (2018)"
_GUIDELINES = "IPCC Guidelines for National Greenhouse Gas Inventories, volume 2, table 1.2 (2006)"


class EnergyContent(NamedTuple):
    """Lower heating value of one unit of a carrier."""

    megajoules: float  # per L, kg or kWh: the unit of the carrier
    source: str

    @property
    def kwh(self) -> float:
        return self.megajoules / MJ_PER_KWH


ENERGY_CONTENT: Mapping[str, EnergyContent] = MappingProxyType(
    {
        "petrol": EnergyContent(32.0, _DIRECTIVE),
        "diesel": EnergyContent(36.0, _DIRECTIVE),
        "ethanol-blend": EnergyContent(0.85 * 21.0 + 0.15 * 32.0, f"85 % ethanol by volume, {_DIRECTIVE}"),
        "lpg": EnergyContent(24.0, f"propane, {_DIRECTIVE}"),
        "cng": EnergyContent(48.0, f"natural gas, {_GUIDELINES}"),
        "hydrogen": EnergyContent(120.0, _DIRECTIVE),
        "electricity": EnergyContent(MJ_PER_KWH, "by definition"),
    }
)


def kwh_per_unit(carrier: str, stated: float | None = None) -> float:
    """kWh in one L, kg or kWh of a carrier: as stated, else the table's. Raises ConsumptionError."""
    if carrier not in ENERGY_CONTENT:
        raise ConsumptionError(f"unknown carrier {carrier!r}: use one of {', '.join(ENERGY_CONTENT)}")
    if stated is None:
        return ENERGY_CONTENT[carrier].kwh
    if not 0 < stated < math.inf:
        unit, usual = UNIT_OF_CARRIER[carrier], ENERGY_CONTENT[carrier].kwh
        raise ConsumptionError(
            f"energy content {stated:g} of {carrier} must be more than 0: state kWh per {unit}, such as {usual:.1f}"
        )
    return stated
