"""Ways to run a test before anything is fitted, compared in km."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.inference.describe import noise_of
from energytrack.inference.distance import ALTERNATIONS, design
from energytrack.inference.looks import FEWEST_BASELINE
from energytrack.inference.model import fit_model
from energytrack.inference.question import Question
from energytrack.inference.results import Plan

if TYPE_CHECKING:
    import pandas as pd


def plan(
    entries: pd.DataFrame,
    target_percent: float = 3.0,
    *,
    confidence: float = 0.95,
    power: float = 0.80,
    modifications: pd.DataFrame | None = None,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    weather: pd.DataFrame | None = None,
    events: pd.DataFrame | None = None,
    two_carriers: TwoCarriers | None = None,
) -> Plan:
    """Distance to the target for one switch and for alternating, from the log's own noise, habit and seasons.

    Tables and errors as for `assess`. Modifications already logged are allowed for, and stay as they are now.
    """
    question = Question("", float(target_percent) / 100, 1 - confidence, power, tuple(covariates or ()))
    observed, notes = observe_frames(
        entries,
        modifications,
        events=events,
        weather=weather,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        two_carriers=two_carriers,
    )
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    ready = len(observed.energy) >= FEWEST_BASELINE
    model = fit_model(observed, None, covariates=question.covariates) if ready else None
    ways = (None, *ALTERNATIONS)
    return Plan(
        vehicle=vehicle,
        unit=observed.unit,
        target_percent=100 * question.target,
        confidence=confidence,
        power=power,
        distance_baseline_km=float(observed.distance_km.sum()),
        segments_baseline=len(observed.energy),
        noise=None if model is None else noise_of(model),
        designs=() if model is None else tuple(design(model, every, question) for every in ways),
        warnings=notes,
    )
