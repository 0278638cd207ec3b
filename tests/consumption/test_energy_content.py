"""Energy contents against published figures other than the ones they were taken from."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from energytrack.consumption.energy_content import ENERGY_CONTENT, kwh_per_unit
from energytrack.errors import ConsumptionError
from energytrack.logbook.records import CARRIERS, UNIT_OF_CARRIER

# IPCC Guidelines (2006), volume 2, table 1.2: MJ/kg. Densities: middle of EN 228 (petrol), EN 590 (diesel), and liquid
# propane at 15 degrees Celsius. All from memory.
BY_MASS = {"petrol": (44.3, 0.7475), "diesel": (43.0, 0.8325), "lpg": (47.3, 0.508)}


def test_every_carrier_has_an_energy_content_with_its_source_and_year() -> None:
    assert set(ENERGY_CONTENT) == set(CARRIERS)
    fuels = [content for carrier, content in ENERGY_CONTENT.items() if carrier != "electricity"]
    assert all(content.source.endswith(("(2018)", "(2006)")) for content in fuels)


@pytest.mark.parametrize("fuel", BY_MASS)
def test_contents_by_volume_agree_with_contents_by_mass_and_density(fuel: str) -> None:
    by_mass, density = BY_MASS[fuel]
    assert ENERGY_CONTENT[fuel].megajoules == pytest.approx(by_mass * density, rel=0.04)


def test_the_reference_states_the_same_contents() -> None:
    text = (Path(__file__).parents[2] / "docs" / "reference.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\| ([a-z-]+) \| (L|kg|kWh) \| ([\d.]+) \| (.+) \|$", text, flags=re.MULTILINE)
    assert {carrier: unit for carrier, unit, _, _ in rows} == dict(UNIT_OF_CARRIER)
    assert [float(kwh) for _, _, kwh, _ in rows] == pytest.approx([kwh_per_unit(row[0]) for row in rows], rel=0.005)


def test_hydrogen_agrees_with_its_heat_of_formation() -> None:
    """Water vapour: -241.8 kJ/mol (NIST-JANAF tables, 1998, from memory); hydrogen: 2.016 g/mol."""
    assert ENERGY_CONTENT["hydrogen"].megajoules == pytest.approx(241.8 / 2.016, rel=0.005)


def test_kilowatt_hours() -> None:
    assert kwh_per_unit("petrol") == pytest.approx(8.889, abs=0.001)
    assert kwh_per_unit("diesel") == pytest.approx(10.0)
    assert kwh_per_unit("electricity") == 1.0
    assert kwh_per_unit("petrol", 8.7) == 8.7


@pytest.mark.parametrize("stated", [0.0, -1.0, float("nan"), float("inf")])
def test_a_stated_content_is_more_than_nothing(stated: float) -> None:
    with pytest.raises(ConsumptionError, match=r"state kWh per kg, such as 33.3"):
        kwh_per_unit("hydrogen", stated)


def test_an_unknown_carrier_is_refused() -> None:
    with pytest.raises(ConsumptionError, match="unknown carrier 'steam': use one of petrol"):
        kwh_per_unit("steam")
