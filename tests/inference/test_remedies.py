"""What is proposed where a target is out of reach, for parts that come off again and parts that do not."""

from __future__ import annotations

import numpy as np
import pytest

import energytrack as et
from energytrack.inference.results import Assessment
from energytrack.presentation.enough import render
from tests.simulation import simulate
from tests.uses import DRIFTING


@pytest.fixture(scope="module")
def answers() -> dict[bool, Assessment]:
    log = simulate(DRIFTING, np.random.default_rng(1))
    until = log.entries[log.entries["odometer_km"] <= log.modifications["fitted_km"].iloc[0] + 3_000]
    return {
        reversible: et.assess(
            until, log.modifications.assign(reversible="yes" if reversible else "no"), "part",
            target_percent=3.0, capacity=50.0, every_look=False,
        )
        for reversible in (True, False)
    }  # fmt: skip


def test_a_part_that_comes_off_may_be_taken_off_and_on(answers: dict[bool, Assessment]) -> None:
    assert answers[True].verdict == "out-of-reach"
    assert answers[True].reversible
    assert {"larger-target", "alternate"} <= {remedy.what for remedy in answers[True].remedies}


def test_a_part_that_stays_on_is_never_to_be_taken_off(answers: dict[bool, Assessment]) -> None:
    stays = answers[False]
    assert (stays.verdict, stays.reversible) == ("out-of-reach", False)
    assert [remedy.what for remedy in stays.remedies] == ["larger-target"]
    text = " ".join(" ".join(line.plain for line in render(stays)).split())
    assert "cannot be taken off again" in text
    assert "off and on" not in text
