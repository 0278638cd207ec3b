"""Units against published definitions, numbers as typed, and figures as shown."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import constants

from energytrack.errors import EntryError
from energytrack.logbook.quantities import (
    CONSUMPTION,
    DISTANCE,
    ENERGY,
    base_unit,
    consumption,
    consumption_text,
    distance_text,
    energy_text,
    from_base,
    in_any_case,
    parse_number,
    parse_temperature,
    rounded,
    speed_text,
    to_base,
)
from energytrack.logbook.records import Vehicle

VAN = Vehicle("van", "diesel", "L", 70)
US_CAR = Vehicle("car", "petrol", "L", 57, "mi", "mpg-us", typed_unit="gal-us")


@pytest.mark.parametrize(
    ("unit", "base"),
    [
        # NIST SP 811 (2008), appendix B.8, as printed there to seven figures or exactly; values from memory
        ("gal-us", 3.785412),
        ("gal-imp", 4.54609),
        ("mi", 1.609344),
        ("lb", 0.4535924),
        ("MJ", 1 / 3.6),
    ],
)
def test_factors_of_nist_sp_811(unit: str, base: float) -> None:
    assert to_base(1.0, unit) == pytest.approx(base, rel=2e-7)


@pytest.mark.parametrize(
    ("unit", "base"),
    [
        # scipy.constants, SI units
        ("gal-us", constants.gallon / constants.liter),
        ("gal-imp", constants.gallon_imp / constants.liter),
        ("mi", constants.mile / constants.kilo),
        ("lb", constants.lb),
        ("MJ", constants.mega / (constants.kilo * constants.hour)),
    ],
)
def test_factors_of_scipy_constants(unit: str, base: float) -> None:
    assert to_base(1.0, unit) == pytest.approx(base, rel=1e-12)


def test_fuel_economy_of_nist_sp_811() -> None:
    """SP 811 appendix B.8, from memory: L/100 km = 235.215 / (miles per US gallon); 1 mpg (US) = 0.4251437 km/L."""
    energy_per_km = to_base(1.0, "gal-us") / to_base(30.0, "mi")
    assert consumption(energy_per_km, VAN) == pytest.approx(235.215 / 30, rel=0.0005 / 235)
    assert consumption(energy_per_km, Vehicle("v", "petrol", "L", display="km/L")) == pytest.approx(
        30 * 0.4251437, rel=1e-6
    )
    assert consumption(energy_per_km, US_CAR) == pytest.approx(30)


def test_imperial_and_us_miles_per_gallon() -> None:
    """The imperial gallon is about 1.2 US gallons (common practice, no source)."""
    imperial = consumption(0.08, Vehicle("v", "petrol", "L", display="mpg-imp"))
    assert imperial / consumption(0.08, US_CAR) == pytest.approx(1.2, abs=0.001)


@pytest.mark.parametrize(("typed", "expected"), [("32F", 0.0), ("212 F", 100.0), ("-40°F", -40.0), ("12", 12.0)])
def test_temperatures(typed: str, expected: float) -> None:
    """Freezing and boiling point of water, and where both scales meet (NIST SP 811 B.8: t/C = (t/F - 32)/1.8)."""
    assert parse_temperature(typed) == pytest.approx(expected)
    assert parse_temperature("21.5 °C") == 21.5


@pytest.mark.parametrize("unit", [*ENERGY, *DISTANCE])
@given(value=st.floats(1e-3, 1e6))
def test_there_and_back(unit: str, value: float) -> None:
    assert from_base(to_base(value, unit), unit) == pytest.approx(value, rel=1e-14)


@pytest.mark.parametrize("display", CONSUMPTION)
def test_every_display_is_shown_in_three_figures(display: str) -> None:
    unit = CONSUMPTION[display].energy
    vehicle = Vehicle("v", "petrol", base_unit(unit), display=display)
    figure, _, label = consumption_text(0.0764321, vehicle).partition(" ")
    assert float(figure) == pytest.approx(consumption(0.0764321, vehicle), rel=5e-3)
    assert sum(letter.isdigit() for letter in figure.lstrip("0.")) == 3
    assert label == CONSUMPTION[display].label


def test_a_decimal_comma_is_told_how_to_write_it() -> None:
    with pytest.raises(EntryError, match=r"amount has a decimal comma: write 41.32, not 41,32"):
        parse_number("41,32", "amount")


@pytest.mark.parametrize("typed", ["nan", "inf", "-inf", "Infinity", "1e999", "", " ", "4l.3", "4_1", "٤١", "1 L", "+"])
def test_what_is_no_finite_number_is_refused(typed: str) -> None:
    with pytest.raises(EntryError, match=r"odometer .* is not a number"):
        parse_number(typed, "odometer")


@pytest.mark.parametrize("typed", ["1,234.5", "48 230", "48'230", "1.234,5", "1_000"])
def test_thousands_separators_are_named(typed: str) -> None:
    with pytest.raises(EntryError, match="thousands separators"):
        parse_number(typed, "odometer")


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_every_number_of_a_measure_is_read_as_written(value: float) -> None:
    if value == 0 or 1e-15 <= abs(value) <= 1e15:
        assert parse_number(repr(value), "amount") == value
    else:
        with pytest.raises(EntryError, match="beyond anything measured"):
            parse_number(repr(value), "amount")


@given(st.text())
def test_any_text_is_a_finite_number_or_refused(text: str) -> None:
    try:
        value = parse_number(text, "amount")
    except EntryError:
        return
    assert math.isfinite(value)


def test_shown_in_the_units_of_the_vehicle() -> None:
    assert distance_text(1860.4, VAN) == "1,860 km"
    assert distance_text(3.25, VAN) == "3.2 km"
    assert distance_text(to_base(30_000, "mi"), US_CAR) == "30,000 mi"
    assert energy_text(41.3, VAN) == "41.30 L"
    assert energy_text(to_base(10.5, "gal-us"), US_CAR) == "10.50 gal (US)"
    assert speed_text(to_base(55, "mi"), US_CAR) == "55 mi/h"


@pytest.mark.parametrize(
    ("value", "shown"), [(8.239, "8.24"), (9.999, "10.0"), (0.0456, "0.0456"), (1234.4, "1,234"), (0, "0")]
)
def test_significant_digits(value: float, shown: str) -> None:
    assert rounded(value, 3) == shown


def test_an_unknown_unit_lists_those_known() -> None:
    with pytest.raises(EntryError, match="unknown unit 'gallon': use one of L, gal-us"):
        to_base(1.0, "gallon")


@pytest.mark.parametrize("unit", [*ENERGY, *DISTANCE, *CONSUMPTION])
def test_units_are_known_in_any_case(unit: str) -> None:
    words = (*ENERGY, *DISTANCE, *CONSUMPTION)
    assert {in_any_case(text, words) for text in (unit.lower(), unit.upper(), f" {unit} ")} == {unit}


def test_what_is_no_unit_stays_as_typed() -> None:
    assert in_any_case("Bushel", ENERGY) == "Bushel"
