"""A known change: a deliberate, sizeable alteration that shows whether the log can see anything at all."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

from energytrack.inference.results import Assessment, KnownChange, Range
from energytrack.logbook.records import Modification


def with_known_change(answer: Assessment, modifications: Iterable[Modification]) -> Assessment:
    """The answer held against the shift expected of the modification; its last row that expects one counts."""
    known = {row.name: row.known for row in modifications if row.known is not None}
    expected = known.get(answer.modification)
    seen = None if expected is None else known_change(answer, expected)
    return replace(answer, known_percent=expected, known_change=seen, known_change_logged=bool(known))


def known_change(answer: Assessment, expected: Range) -> KnownChange:
    """Whether the log saw it: a shift in the direction expected whose range meets the range expected."""
    if answer.verdict != "shifted" or answer.shift_percent is None:
        return "not-seen-yet"
    same_way = answer.shift_percent * expected[0] > 0
    span = answer.interval_percent
    meets = span is None or (span[0] <= expected[1] and expected[0] <= span[1])
    return "seen" if same_way and meets else "seen-otherwise"
