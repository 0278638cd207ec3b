"""Text behind aligned columns: folded under itself, nothing cut, no line too wide."""

from __future__ import annotations

import pytest

from energytrack.presentation.columns import cells_wide, folded

SLIP = "unusual, two digits swapped? odometer 33,520 -> 33,250 km fits, seen at the pump"


def test_a_long_end_goes_on_under_itself() -> None:
    assert folded(["2026-05-01  40.10 L", "2026-05-08   9.00 L"], [SLIP, ""], 60) == [
        "2026-05-01  40.10 L  unusual, two digits swapped? odometer",
        "                     33,520 -> 33,250 km fits, seen at the",
        "                     pump",
        "2026-05-08   9.00 L",
    ]


def test_heads_of_one_width_need_not_be() -> None:
    assert folded(["2026-05-01", "x"], ["partial", "full"], 60) == ["2026-05-01  partial", "x           full"]


@pytest.mark.parametrize("text", [SLIP, "x" * 200, "漢" * 90, f"{'y' * 70} {SLIP}"])
@pytest.mark.parametrize("head", ["", "head", "h" * 65])
def test_nothing_is_lost_and_no_line_is_too_wide(head: str, text: str) -> None:
    lines = folded([head], [text], 80)
    assert max(map(cells_wide, lines)) <= 80
    assert "".join("".join(lines).split()) == head + text.replace(" ", "")
