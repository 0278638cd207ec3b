"""What is said whenever a modification is logged."""

from __future__ import annotations

CAUTIONS = (
    "Log when parked.",
    "A modification can change braking, cooling, tyre load, sight and lighting: the vehicle regulations of the place "
    "and an inspection by a licensed workshop come first.",
    "Never trade safety, speed limits, or tyre pressures outside the maker's range for a test.",
    "A statistical verdict is not an approval of the part.",
)


def caution_lines(width: int = 80) -> list[str]:
    """The cautions as lines for a terminal."""
    from textwrap import wrap

    lines = [line for each in CAUTIONS for line in wrap(each, width, initial_indent="- ", subsequent_indent="  ")]
    return ["Before driving:", *lines]
