"""A shift beside control vehicles, on the terminal."""

from __future__ import annotations

from rich.text import Text

from energytrack.inference.fleet.results import ControlledShift
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import labelled, wrap

_VERDICTS = {
    "shifted": "{name} shifted consumption.",
    "no-shift-of-target-size": "{name} did not shift consumption by {target} or more.",
    "closed-unclear": "The test of {name} is over, and a shift of {target} can be neither shown nor ruled out.",
    "not-yet": "Not yet: about {far} more with {name}, at the target of {target}.",
    "out-of-reach": "Out of reach: driving on like this does not resolve {target}, not even beside the controls.",
    "no-baseline": "No answer yet: {name} needs at least 5 segments without it, and one with it.",
}


def render(found: ControlledShift, unit: str, width: int = 80) -> list[Text]:
    """Sentence, then the shift beside the controls and alone."""
    far = "" if found.distance_to_go_km is None else figures.distance(found.distance_to_go_km, unit)
    name = plain_text(found.modification)
    said = _VERDICTS[found.verdict].format(name=name, far=far, target=figures.target(found.target_percent))
    lines = [Text(line, style="bold") for line in wrap(said, width)]
    if found.shift_percent is None or found.standard_error_percent is None:
        return lines
    span = figures.bounded(found.interval_percent)
    reach = "no bounded range yet" if span is None else f"look-proof range {figures.percent_range(span)}"
    rows = [
        ("beside controls", f"{_shift(found.shift_percent, found.standard_error_percent)}, {reach}"),
        ("controls", ", ".join(map(plain_text, found.controls))),
    ]
    if found.alone is not None:
        alone = _shift(found.alone.shift_percent, found.alone.standard_error_percent)
        rows.insert(1, ("without them", alone))
    rows.append(("evidence gathered", _gathered(found)))
    if found.common_share is not None and found.common_share_sd is not None:
        share = f"{100 * found.common_share:.0f} (+/- {100 * found.common_share_sd:.0f})\u00a0% of its variance"
        rows.append(("drift in common", share))
    return [*lines, Text(), *map(Text, labelled(rows, width))]


def _shift(shift: float, error: float) -> str:
    return f"{figures.percent(shift, error, signed=True)}, standard error {figures.percent(error, error)}"


def _gathered(found: ControlledShift) -> str:
    beside = f"{100 * (found.information_fraction or 0.0):.0f}\u00a0%"
    return beside if found.alone is None else f"{beside}; {100 * found.alone.information_fraction:.0f}\u00a0% alone"
