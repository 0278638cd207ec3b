"""CO2 factors against published tables other than the heating values they are multiplied with. All from memory."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from energytrack.consumption.emissions import FACTORS, check_stated, factor_of
from energytrack.consumption.energy_content import ENERGY_CONTENT
from energytrack.errors import ConsumptionError
from energytrack.logbook.quantities import LITRES_PER_US_GALLON
from energytrack.logbook.records import CARRIERS

# IPCC Guidelines for National Greenhouse Gas Inventories (2006), volume 2, chapter 3, table 3.2.1, default, kg per TJ:
# motor gasoline, gas/diesel oil, liquefied petroleum gases, compressed natural gas. From memory.
PER_TERAJOULE = {"petrol": 69_300.0, "diesel": 74_100.0, "lpg": 63_100.0, "cng": 56_100.0}

# United States, 40 CFR 600.113 and the light-duty rule of EPA and NHTSA (2010): 8,887 g a gallon of gasoline and
# 10,180 g a gallon of diesel. From memory.
PER_GALLON = {"petrol": 8.887, "diesel": 10.180}

# All carbon burnt, kg of CO2 per kg: molar masses of C 12.011, H 1.008, O 15.999 (IUPAC), propane and methane; their
# density or share of the fuel as in tests/consumption/test_energy_content.py.
CO2_MOLE = 12.011 + 2 * 15.999
PROPANE = 3 * CO2_MOLE / (3 * 12.011 + 8 * 1.008)
METHANE = CO2_MOLE / (12.011 + 4 * 1.008)


@pytest.mark.parametrize("carrier", PER_TERAJOULE)
def test_per_energy_as_in_the_guidelines(carrier: str) -> None:
    assert 1e6 * FACTORS[carrier].kg / ENERGY_CONTENT[carrier].megajoules == pytest.approx(PER_TERAJOULE[carrier])
    assert FACTORS[carrier].source.endswith("(2006)")


@pytest.mark.parametrize("carrier", PER_GALLON)
def test_per_gallon_as_in_another_country(carrier: str) -> None:
    """Within 6 %: fuels differ, and the European heating value of petrol is a round and low one."""
    assert FACTORS[carrier].kg * LITRES_PER_US_GALLON == pytest.approx(PER_GALLON[carrier], rel=0.06)


def test_gases_as_by_their_formula() -> None:
    assert FACTORS["lpg"].kg == pytest.approx(0.508 * PROPANE, rel=0.01)
    assert FACTORS["cng"].kg == pytest.approx(METHANE, rel=0.03)  # natural gas is nearly methane


def test_biofuel_is_not_counted_and_hydrogen_has_no_carbon() -> None:
    assert FACTORS["ethanol-blend"].kg == pytest.approx(0.15 * FACTORS["petrol"].kg)
    assert FACTORS["hydrogen"].kg == 0.0


def test_electricity_has_no_factor_unless_one_is_stated() -> None:
    assert set(CARRIERS) - set(FACTORS) == {"electricity"}
    assert factor_of("electricity", {}) is None
    stated = factor_of("electricity", {"electricity": 0.35})
    assert stated is not None
    assert (stated.kg, stated.source) == (0.35, "stated")


@pytest.mark.parametrize(("carrier", "kg"), [("coal", 1.0), ("diesel", -0.1), ("diesel", float("nan"))])
def test_what_cannot_be_a_factor_is_refused(carrier: str, kg: float) -> None:
    with pytest.raises(ConsumptionError, match=r"use one of petrol|state kg per L"):
        check_stated({carrier: kg})


def test_the_reference_states_the_same_factors() -> None:
    text = (Path(__file__).parents[2] / "docs" / "reference.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\| ([a-z-]+) \| ([\d.]+) kg per (?:L|kg) \|", text, flags=re.MULTILINE)
    assert {carrier: float(kg) for carrier, kg in rows} == pytest.approx(
        {carrier: factor.kg for carrier, factor in FACTORS.items()}, abs=0.005
    )
