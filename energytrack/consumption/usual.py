"""What road vehicles usually consume: enough to see a gross slip where a vehicle has no record of its own yet."""

from __future__ import annotations

from types import MappingProxyType

from energytrack.logbook.quantities import consumption_text
from energytrack.logbook.records import Vehicle

# base units per 100 km, of cars and vans; common practice, no source
USUAL_PER_100_KM = MappingProxyType(
    {
        "petrol": 7.0,
        "diesel": 8.0,
        "ethanol-blend": 10.0,
        "lpg": 10.0,
        "cng": 5.0,
        "hydrogen": 1.0,
        "electricity": 18.0,
    }
)
_FACTOR = 4.0  # either way: from a small motorcycle to a lorry


def hardly_possible(carrier: str, energy_per_km: float) -> bool:
    """Whether a consumption (base units per km) lies outside four times the carrier's usual one, up or down."""
    usual = USUAL_PER_100_KM.get(carrier)
    return usual is not None and not usual / _FACTOR <= 100 * energy_per_km <= usual * _FACTOR


def far_from_usual(energy_per_km: float, vehicle: Vehicle) -> list[str]:
    """The flag of a consumption that is hardly possible; a vehicle with tank and battery has no usual one."""
    if vehicle.second_carrier is not None or not hardly_possible(vehicle.carrier, energy_per_km):
        return []
    usual = consumption_text(USUAL_PER_100_KM[vehicle.carrier] / 100, vehicle)
    return [
        f"far from what is usual for {vehicle.carrier} (about {usual}): kept; check amount, odometer and their units"
    ]
