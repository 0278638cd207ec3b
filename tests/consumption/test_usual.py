"""What is usual, held against figures from outside."""

from __future__ import annotations

import pytest

from energytrack.consumption.usual import USUAL_PER_100_KM, hardly_possible
from energytrack.logbook.records import CARRIERS


@pytest.mark.parametrize(
    ("carrier", "per_100_km"),
    [  # common practice, no source: a small motorcycle, a lorry of 12 t, a compact electric car, a large one in winter
        ("petrol", 2.5),
        ("diesel", 25.0),
        ("electricity", 12.0),
        ("electricity", 35.0),
    ],
)
def test_what_is_driven_on_roads_is_possible(carrier: str, per_100_km: float) -> None:
    assert not hardly_possible(carrier, per_100_km / 100)


def test_every_carrier_has_a_usual_figure_and_a_gross_slip_is_seen() -> None:
    assert set(USUAL_PER_100_KM) == set(CARRIERS)
    for carrier, usual in USUAL_PER_100_KM.items():
        assert hardly_possible(carrier, usual / 10 / 100)  # a digit of the amount missing
        assert hardly_possible(carrier, usual * 10 / 100)


def test_a_carrier_without_a_usual_figure_is_never_flagged() -> None:
    assert not hardly_possible("", 5.0)
