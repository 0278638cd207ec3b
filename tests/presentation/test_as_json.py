"""Answers as JSON."""

from __future__ import annotations

import json
from dataclasses import replace

from energytrack.presentation.as_json import without_nan
from tests.presentation.samples import NO_BASELINE, NOT_YET, PLAN


def strict(text: str) -> object:
    def refuse(constant: str) -> None:
        raise AssertionError(f"{constant} is not JSON (RFC 8259)")

    return json.loads(text, parse_constant=refuse)


def test_what_does_not_exist_is_null() -> None:
    a = replace(NOT_YET, degrees_of_freedom=float("inf"), interval_percent=(float("-inf"), float("nan")))
    found = strict(json.dumps(without_nan({"assessments": [a.to_dict(), NO_BASELINE.to_dict()]}), allow_nan=False))
    assert isinstance(found, dict)
    first, second = found["assessments"]
    assert first["degrees_of_freedom"] is None
    assert first["interval_percent"] == [None, None]
    assert first["shift_percent"] == -2.1
    assert second["shift_percent"] is None
    assert second["noise"] is None


def test_a_plan_is_json_too() -> None:
    found = strict(json.dumps(without_nan({"plans": [PLAN.to_dict()]}), allow_nan=False))
    assert isinstance(found, dict)
    assert found["plans"][0]["designs"][0]["distance_interval_km"] == [8100.0, None]
