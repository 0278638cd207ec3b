"""Changes nobody declared as text: the sentence, the drawing, the tables, what to do next."""

from __future__ import annotations

import datetime as dt
import re
from dataclasses import replace

import pytest
from rich.cells import cell_len

from energytrack.inference.regimes.results import RegimeReport
from energytrack.logbook.records import Event, Modification, Vehicle
from energytrack.presentation.regimes.answer import next_steps, render, sentence
from energytrack.presentation.regimes.bins import binned
from energytrack.presentation.regimes.drawing import lines
from energytrack.presentation.regimes.marks import Mark, marks_of
from tests.presentation.regime_samples import (
    FIRST_KM,
    IN_MILES,
    LAST_KM,
    LEVELS,
    MARKS,
    NONE,
    ONCE,
    TOO_FEW,
    TWICE,
    UNEXPLAINED,
    VAN,
    points,
)

KM_PER_MI = 1.609344  # international mile of 1959
L_PER_GALLON = 3.785411784  # NIST Handbook 44, appendix C


def said(report: RegimeReport, unit: str = "km") -> str:
    return sentence(report, unit).replace("\u00a0", " ")


def shown(report: RegimeReport, vehicle: Vehicle = VAN, width: int = 80) -> list[str]:
    return [line.plain for line in render(report, vehicle, MARKS, width=width)]


def test_the_answer_comes_first() -> None:
    assert said(TWICE) == (
        "Consumption shifted twice: -5.4 % at about 48,900 km (agrees with side skirts fitted), "
        "+9.2 % at about 55,000 km (nothing logged there)."
    )
    assert said(ONCE).startswith("Consumption shifted once: -5.4 %")
    assert said(replace(TWICE, breaks=(*TWICE.breaks, UNEXPLAINED))).startswith("Consumption shifted 3 times: ")
    assert said(NONE) == "No lasting change found between 43,000 and 57,000 km."
    assert said(TOO_FEW).endswith("5 more fill-ups to the full mark or readings, about 2,800 km.")
    assert " ".join(shown(TWICE)[:3]).startswith(said(TWICE))


def test_nothing_but_the_reason_where_nothing_could_be_looked_for() -> None:
    assert " ".join(shown(TOO_FEW)) == said(TOO_FEW)


def test_distances_in_the_unit_of_the_odometer() -> None:
    assert f"at about {round(48_900 / KM_PER_MI, -2):,.0f} mi" in said(TWICE, "mi")
    text = "\n".join(shown(TWICE, IN_MILES))
    assert " km" not in text
    assert f'event "WHAT HAPPENED" {55_000 / KM_PER_MI:.0f}' in " ".join(text.split())


def test_a_level_in_mpg_has_its_range_low_to_high() -> None:
    (row,) = [line for line in shown(TWICE, IN_MILES) if "2025-01-01 to 2025-05-14" in line]
    level, low, high = (float(word) for word in re.findall(r"\d+\.\d", row))
    by_hand = [L_PER_GALLON / KM_PER_MI / consumption for consumption in (0.092, 0.0930, 0.0910)]
    assert [level, low, high] == pytest.approx(by_hand, abs=0.05)
    assert low < level < high


def far_driven(report: RegimeReport) -> RegimeReport:
    """The same report of an odometer past a million km, with wide ranges."""
    km = 960_000.0
    return replace(
        report,
        points=tuple(replace(p, start_km=p.start_km + km, end_km=p.end_km + km) for p in report.points),
        regimes=tuple(replace(r, start_km=r.start_km + km, end_km=r.end_km + km) for r in report.regimes),
        breaks=tuple(
            replace(
                b, odometer_km=b.odometer_km + km, interval_km=(998_000.0, 1_019_000.0), shift_percent=-15.4,
                interval_percent=(-24.9, -10.1),
            )
            for b in report.breaks
        ),
    )  # fmt: skip


@pytest.mark.parametrize("vehicle", [VAN, IN_MILES])
@pytest.mark.parametrize("report", [TWICE, ONCE, NONE, TOO_FEW, far_driven(TWICE)])
def test_every_line_fits_eighty_columns(report: RegimeReport, vehicle: Vehicle) -> None:
    assert max(map(cell_len, shown(report, vehicle))) <= 80


@pytest.mark.parametrize("width", [60, 80, 100])
@pytest.mark.parametrize("report", [TWICE, NONE, far_driven(TWICE)])
def test_the_drawing_fits_and_is_plain_ascii(report: RegimeReport, width: int) -> None:
    found = lines(report, VAN, MARKS, width)
    assert width - 2 <= max(map(len, found)) <= width
    assert all(line.isascii() for line in found)


def drawn(report: RegimeReport, width: int = 80) -> tuple[list[str], int]:
    """The lines of the drawing, and the cell in which its odometer begins."""
    found = lines(report, VAN, MARKS, width)
    return found, found[1].index("|") + 1


def km_of(cell: int, start: int, width: int) -> float:
    """Middle of a cell, by its share of the width."""
    return FIRST_KM + (cell - start + 0.5) / (width - start) * (LAST_KM - FIRST_KM)


@pytest.mark.parametrize("width", [60, 80])
def test_changes_and_marks_stand_where_they_belong(width: int) -> None:
    found, start = drawn(TWICE, width)
    a_cell = (LAST_KM - FIRST_KM) / (width - start)
    below = next(line for line in found if "(" in line and "~" in line)
    places = [match.start() for match in re.finditer(r"\|", below)]
    assert [km_of(cell, start, width) for cell in places] == pytest.approx([48_900, 55_000], abs=a_cell)
    opened = [match.start() for match in re.finditer(r"\(", below)]
    assert [km_of(cell, start, width) for cell in opened] == pytest.approx([48_200, 54_300], abs=a_cell)
    rows = [line for line in found if re.fullmatch(r"[ ABC]+", line)]
    letters = {mark: row.index(mark) for row in rows for mark in "ABC" if mark in row}
    assert [km_of(letters[mark], start, width) for mark in "ABC"] == pytest.approx(
        [48_900, 49_100, 58_000], abs=a_cell
    )
    assert "B service, 49,100 km" in found


def test_levels_stand_beside_their_consumption() -> None:
    found, start = drawn(TWICE)
    rows = found[1:14]
    named = {k: float(row[: start - 1]) for k, row in enumerate(rows) if row[: start - 1].strip()}
    (first, top), (last, bottom) = min(named.items()), max(named.items())
    a_row = (top - bottom) / (last - first)
    before = 0.0
    for end, level in LEVELS:
        cells = slice(start, None)
        inside = [
            k
            for k, row in enumerate(rows)
            for cell, each in enumerate(row[cells])
            if each == "=" and before + 500 < km_of(cell + start, start, 80) < end - 500
        ]
        assert len(set(inside)) == 1, "one row a regime"
        assert top - (inside[0] - first) * a_row == pytest.approx(100 * level, abs=0.6 * a_row + 0.05)
        before = end


def test_marks_on_one_place_stand_below_each_other() -> None:
    together = (Mark("one", 50_000.0), Mark("other", 50_000.0))
    found = [line.strip() for line in lines(TWICE, VAN, together, 80)]
    assert found.index("B") == found.index("A") + 1


def test_only_the_newest_marks_get_a_letter() -> None:
    many = [Mark(f"part {number}", 40_000.0 + 500 * number) for number in range(30)]
    found = lines(TWICE, VAN, many, 80)
    assert "the newest 26 of 30 marks are shown" in found
    assert "A part 4, 42,000 km" in found


def test_a_long_log_is_binned_and_keeps_its_mean() -> None:
    long = replace(TWICE, points=points(20_000))
    found = lines(long, VAN, (), 80)
    assert max(map(len, found)) <= 80
    assert any("mean of about" in line for line in found)
    means = binned(long.points, 50)
    assert len(means) == 50
    assert sum(each.segments for each in means) == 20_000
    energy = sum(p.consumption * (p.end_km - p.start_km) for p in long.points)
    assert sum(each.consumption for each in means) / 50 == pytest.approx(energy / (LAST_KM - FIRST_KM), rel=1e-9)


def test_a_constant_log_and_a_single_segment_are_drawn() -> None:
    flat = tuple(replace(p, consumption=0.0915) for p in NONE.points)
    regime = replace(NONE.regimes[0], consumption=0.0915, interval=(0.0915, 0.0915))
    for some in (flat, flat[:1]):
        found = lines(replace(NONE, points=some, regimes=(regime,)), VAN, (), 80)
        assert any("o" in line.split("|")[1] for line in found[1:14])


def test_tables_say_place_size_and_what_agrees() -> None:
    text = "\n".join(shown(TWICE))
    assert "-5.4 %     -7.2 to -3.7 %" in text
    assert "48,200 to 49,900  2025-05-03 to 2025-05-29" in text
    assert "< 0.001" in text
    assert "  agrees with side skirts fitted at 48,900 km; and with service on 2025-05-20" in text
    assert "  unexplained: nothing was logged in that range" in text
    assert "160.2, 141.7, 133.0 for 0 to 2" in text
    assert "sequential sup-F tests (BIC agrees)" in text


def test_a_range_without_ends_is_called_open() -> None:
    boundless = replace(ONCE, breaks=(replace(TWICE.breaks[0], interval_percent=None),))
    assert any(re.match(r"-5\.4 % +open", line) for line in shown(boundless))


def test_an_unexplained_rise_asks_for_an_inspection_first() -> None:
    steps = [step.replace("\u00a0", " ") for step in next_steps(TWICE)]
    assert "qualified person" in steps[0]
    assert steps[1].endswith('energytrack event "WHAT HAPPENED" 55000')
    assert "brakes: one that drags" in steps[2]
    assert steps[3] == 'For the verdict on it: energytrack enough "side skirts"'
    assert steps[-1] == "A change that happens now can be told after about 3,000 km more at the earliest."


def test_no_change_found_is_not_called_none_there() -> None:
    assert "none was found does not show" in " ".join(" ".join(shown(NONE)).split())
    assert "none was found" not in " ".join(shown(TWICE))


def test_what_others_wrote_cannot_steer_the_terminal() -> None:
    switched = marks_of([Modification("van", "skirts\x1b[31m", None, 50_000.0)], [], TWICE.points)
    assert [mark.what for mark in switched] == ["skirts\ufffd[31m fitted"]
    named = replace(TWICE, vehicle="v\x1ban", warnings=("w\x1b[2J",))
    assert "\x1b" not in "\n".join(line.plain for line in render(named, VAN, switched, title=True))


def test_what_is_known_by_its_day_stands_where_the_vehicle_was_that_day() -> None:
    on = [Modification("van", "skirts", fitted_date=dt.date(2025, 5, 30), removed_km=59_000.0)]
    happened = [Event("van", dt.date(2024, 1, 1), "long before")]
    found = marks_of(on, happened, TWICE.points)
    assert [mark.what for mark in found] == ["long before", "skirts fitted", "skirts removed"]
    assert found[0].km == FIRST_KM
    # 2025-05-30 is day 149 of 300 over 20,000 km; a segment takes 7.5 days and 500 km
    assert found[1].km == pytest.approx(FIRST_KM + 149 / 300 * 20_000, abs=500)
    assert found[2].km == 59_000.0
