"""Changes nobody declared, beside the answer: what stands against it, what agrees with it, and where to look."""

from __future__ import annotations

from typing import TYPE_CHECKING

from energytrack.inference.results import Assessment
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import join

if TYPE_CHECKING:
    from energytrack.inference.regimes.results import Break


def withheld_sentence(a: Assessment, name: str, now: str, unit: str) -> str:
    """Why a shift that was found does not count yet."""
    against = a.undeclared[0]
    return (
        f"Not yet, though a shift was found: consumption also changed by "
        f"{figures.percent(against.shift_percent, signed=True)} at about {figures.driven(against.odometer_km, unit)}, "
        f"where nothing was logged, so {name} may get credit for something else. So far {now}."
    )


def agreeing_sentence(a: Assessment, unit: str) -> str:
    """That a search which knows nothing of the modification finds the same change; empty where it does not."""
    if a.agreeing is None or a.verdict != "shifted":
        return ""
    return f"A search blind to it finds the change there as well, {_between(a.agreeing, unit)}."


def told(a: Assessment, unit: str) -> list[str]:
    """One line for each change that nothing logged explains."""
    return [plain_text(_line(found, unit)) for found in a.undeclared]


def withheld_steps(a: Assessment, unit: str) -> list[str]:
    """What to do about the change that holds an answer back."""
    return steps(a.undeclared[0], unit)


def steps(found: Break, unit: str) -> list[str]:
    """What to do about a change that nothing logged explains."""
    command = join(f'energytrack event "WHAT HAPPENED" {figures.in_unit(found.odometer_km, unit):.0f}')
    said = [
        f"If something happened there, log it, and it is counted apart: {command}",
        f"Places to look: {'; '.join(found.suspects)}.",
    ]
    return [found.caution, *said] if found.caution else said


def _line(found: Break, unit: str) -> str:
    size = figures.percent(found.shift_percent, signed=True)
    said = f"consumption changed by {size} {_between(found, unit)}, where nothing was logged"
    said += "; what happened there can be logged as an event"
    return said if found.caution is None else f"{said}. {found.caution}"


def _between(found: Break, unit: str) -> str:
    low, high = (figures.driven(end, unit) for end in found.interval_km)
    return f"between {low.split(' ')[0]} and {high}"
