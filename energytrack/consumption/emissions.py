"""CO2 from each carrier's use, tank to wheel: what leaves the vehicle's exhaust, and nothing that happened before.

Fuel: the carbon of the fuel burnt, per energy, from a named public source. CO2 from the bio-part of a blend is not
counted, as in that source; a blend's fossil part is. Electricity has no factor of its own: it depends on the grid, so
it has to be stated. All figures are written down from memory of the documents named beside them.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType
from typing import NamedTuple

from energytrack.consumption.energy_content import ENERGY_CONTENT
from energytrack.errors import ConsumptionError
from energytrack.logbook.records import UNIT_OF_CARRIER

GUIDELINES = "IPCC Guidelines for National Greenhouse Gas Inventories, volume 2, table 3.2.1 (2006)"
_PETROL, _DIESEL, _LPG, _NATURAL_GAS = 69_300.0, 74_100.0, 63_100.0, 56_100.0  # kg CO2 per TJ
_PETROL_IN_BLEND = 0.15  # of the volume of an 85 % ethanol blend


class Factor(NamedTuple):
    """CO2 of one unit of a carrier."""

    kg: float  # per L, kg or kWh: the unit of the carrier
    source: str


def _of(carrier: str, kg_per_terajoule: float) -> Factor:
    return Factor(ENERGY_CONTENT[carrier].megajoules * kg_per_terajoule * 1e-6, GUIDELINES)


FACTORS: Mapping[str, Factor] = MappingProxyType(
    {
        "petrol": _of("petrol", _PETROL),
        "diesel": _of("diesel", _DIESEL),
        "ethanol-blend": Factor(
            _PETROL_IN_BLEND * ENERGY_CONTENT["petrol"].megajoules * _PETROL * 1e-6,
            f"petrol part of an 85 % blend, {GUIDELINES}",
        ),
        "lpg": _of("lpg", _LPG),
        "cng": _of("cng", _NATURAL_GAS),
        "hydrogen": Factor(0.0, "no carbon in it"),
    }
)  # electricity is left out on purpose: see factor_of


def factor_of(carrier: str, stated: Mapping[str, float]) -> Factor | None:
    """kg of CO2 per unit of a carrier: as stated, else the table's; None for electricity where nothing is stated."""
    return Factor(stated[carrier], "stated") if carrier in stated else FACTORS.get(carrier)


def check_stated(stated: Mapping[str, float]) -> None:
    """Raises ConsumptionError for an unknown carrier, or a factor that is negative or no number."""
    for carrier, kg in stated.items():
        if carrier not in UNIT_OF_CARRIER:
            raise ConsumptionError(f"unknown carrier {carrier!r}: use one of {', '.join(UNIT_OF_CARRIER)}")
        if not 0 <= kg < math.inf:
            raise ConsumptionError(
                f"CO2 factor {kg:g} of {carrier} must be 0 or more: state kg per {UNIT_OF_CARRIER[carrier]}"
            )
