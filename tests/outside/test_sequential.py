"""The recursion over looks against tables of repeated significance tests: Pocock's constants, and 1.96 each time."""

from __future__ import annotations

import numpy as np
import pytest

from energytrack.inference.spending import Counted
from tests.outside.values import reference

# Armitage, McPherson and Rowe (1969), J. R. Statist. Soc. A 132:235: chance that |z| > 1.96 at one of K equal looks.
# From memory; the printed digits are checked here by the recursion itself.
EVERY_TIME = {1: 0.05, 2: 0.083, 3: 0.107, 4: 0.126, 5: 0.142, 10: 0.193, 20: 0.248}
# Jennison and Turnbull (2000), Table 2.1, C_P(K, 0.05) to the three digits printed; from memory.
PRINTED = {2: 2.178, 3: 2.289, 4: 2.361, 5: 2.413, 10: 2.555}


def crossing(bound: float, looks: int) -> float:
    """Chance that |z| exceeds a constant bound at one of so many equal looks, by the recursion for counted looks."""
    here, before = Counted(0.05), 0.0
    for share in np.arange(1, looks + 1) / looks:
        here._carry(bound * np.sqrt(share), np.sqrt(share - before))
        before = share
    return 1 - float(np.exp(here._log_mass).sum())


@pytest.mark.parametrize("looks", range(2, 11))
def test_pocock_constants_spend_five_percent(looks: int) -> None:
    """Computed with R rpact; one thousandth in the constant moves the chance by 1.2e-4 or more."""
    constant = reference(f"jt.P.K{looks}").values["C"]
    assert crossing(constant, looks) == pytest.approx(0.05, abs=1e-5)
    assert abs(crossing(constant + 0.001, looks) - 0.05) > 1e-4


@pytest.mark.parametrize("looks", PRINTED)
def test_pocock_constants_as_printed(looks: int) -> None:
    assert crossing(PRINTED[looks] - 0.0006, looks) > 0.05 > crossing(PRINTED[looks] + 0.0006, looks)


@pytest.mark.parametrize("looks", EVERY_TIME)
def test_a_single_looks_bound_every_time(looks: int) -> None:
    assert crossing(1.959964, looks) == pytest.approx(EVERY_TIME[looks], abs=0.0005)
