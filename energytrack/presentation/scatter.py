"""The scatter of one segment, split into its four sources."""

from __future__ import annotations

from dataclasses import dataclass
from math import sqrt

from energytrack.consumption.terms import ELECTRIC
from energytrack.inference.results import Assessment, Noise
from energytrack.presentation.text import join


@dataclass(frozen=True)
class Source:
    """One source of scatter: its size, and its share of the variance where that can be told."""

    label: str
    percent: float | None  # sd, percent of the consumption of an average segment
    detail: str
    share: float | None


def charges_only(a: Assessment) -> bool:
    """Whether the level is that of a battery alone: kWh with no fuel beside them."""
    return a.unit == "kWh" and ELECTRIC not in a.covariates


def sources(a: Assessment) -> list[Source]:
    """Trip to trip, filling, drift over weeks, drift over seasons; [] where the noise is unknown."""
    return [] if a.noise is None else sources_of(a.noise, _segment_energy(a), a.unit, charges_only=charges_only(a))


def sources_of(noise: Noise, segment_energy: float | None, unit: str, *, charges_only: bool) -> list[Source]:
    """The same of any noise; `segment_energy`: of an average segment, in `unit`."""
    detail = f"{join(f'{noise.level_error:.2g} {unit}')} a {'charge' if charges_only else 'filling'}"
    filling = None  # two levels bound a segment, so its error is sqrt(2) times that of one
    if segment_energy is not None and segment_energy > 0:
        filling = 100 * sqrt(2) * noise.level_error / segment_energy
    found = [
        ("from trip to trip", noise.trip_percent, ""),
        ("charge level" if charges_only else "filling", filling, detail),
        ("drift over weeks", noise.drift_weeks_percent, ""),
        ("drift over seasons", noise.drift_seasons_percent, ""),
    ]
    squares = [sd**2 for _, sd, _ in found if sd is not None]
    total = sum(squares) if len(squares) == len(found) else 0.0
    return [
        Source(label, sd, detail, sd**2 / total if sd is not None and total > 0 else None)
        for label, sd, detail in found
    ]


def _segment_energy(a: Assessment) -> float | None:
    segments = a.segments_baseline + a.segments_modified
    if a.expectation is None or not segments:
        return None
    return a.expectation.consumption * (a.distance_baseline_km + a.distance_modified_km) / segments


def rows(a: Assessment) -> list[tuple[str, str]]:
    """A label and a figure for each source."""
    return [("  " + source.label, _figure(source)) for source in sources(a)]


def _figure(source: Source) -> str:
    size = "" if source.percent is None else join(f"{source.percent:.1f} %")
    share = "" if source.share is None else f"{join(f'{100 * source.share:.0f} %')} of the variance"
    return ", ".join(part for part in (size, source.detail, share) if part)
