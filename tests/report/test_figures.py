"""The drawings of a report: labelled with units, nothing cut off, whatever the answer is."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from collections.abc import Callable
from dataclasses import replace

import pytest

from energytrack.inference.report.results import Curve, Dot, Step
from energytrack.logbook.records import Vehicle
from energytrack.presentation import scatter
from energytrack.presentation.graphics import canvas, funnel, noise, response
from energytrack.presentation.graphics.canvas import Drawing
from energytrack.presentation.report.embed import embedded
from tests.presentation.samples import NOT_YET, OUT_OF_REACH, RAISED, SHIFTED

VAN = Vehicle("van", "diesel", "L", 70.0, "km")
MILES = Vehicle("van", "diesel", "L", 70.0, "mi", display="mpg-imp")
STEPS = tuple(Step(v, 0.09 - 0.0005 * v, 0.088 - 0.0005 * v, 0.092 - 0.0005 * v) for v in (-5.0, 5.0, 15.0))
COLD = Curve("temperature_c", tuple(Dot(v, 0.09 - 0.0005 * v, 500.0) for v in (-5.0, 0.0, 9.0, 15.0)), STEPS, 0.95, 2)
SPEED = Curve("speed_kmh", tuple(Dot(v, 0.08 + 0.0003 * v, 500.0) for v in (51.0, 60.0, 70.0)), (
    Step(51.0, 0.0953, 0.094, 0.096), Step(70.0, 0.101, 0.1, 0.102)), 0.95, 0)  # fmt: skip


def driven(count: int) -> list[float]:
    return [430.0 * (k + 1) for k in range(count)]


def looked(answer: object) -> Drawing:
    return funnel.draw(answer, driven(len(answer.looks)), "km")  # type: ignore[attr-defined, arg-type]


ALL: dict[str, Callable[[], Drawing]] = {
    "not yet": lambda: looked(NOT_YET),
    "one look": lambda: looked(replace(NOT_YET, looks=NOT_YET.looks[:1])),
    "shifted": lambda: looked(SHIFTED),
    "out of reach": lambda: looked(OUT_OF_REACH),
    "in miles": lambda: funnel.draw(SHIFTED, driven(len(SHIFTED.looks)), "mi"),
    "cold": lambda: response.draw(COLD, VAN),
    "cold, miles per gallon": lambda: response.draw(COLD, MILES),
    "speed": lambda: response.draw(SPEED, MILES),
    "noise": lambda: noise.draw(scatter.sources(NOT_YET)),
}


def words(drawing: Drawing) -> list[str]:
    root = ET.fromstring(canvas.svg(drawing))
    return [element.text or "" for element in root.iter("{http://www.w3.org/2000/svg}text")]


@pytest.mark.parametrize("name", ALL)
def test_nothing_is_cut_off_or_lies_on_the_legend(name: str) -> None:
    with canvas._figure(ALL[name]()) as figure:
        figure.draw_without_rendering()
        whole, used = figure.bbox_inches, figure.get_tightbbox()
        assert used.x0 >= whole.x0
        assert used.y0 >= whole.y0
        assert used.x1 <= whole.x1
        assert used.y1 <= whole.y1
        for legend in figure.legends:
            assert not legend.get_window_extent().overlaps(figure.axes[0].get_tightbbox())
        assert figure.axes[0].bbox.height > 0.4 * figure.bbox.height


def test_axes_have_units() -> None:
    assert {"distance driven with it, km", "shift of consumption, %"} <= set(words(ALL["not yet"]()))
    assert "distance driven with it, mi" in words(ALL["in miles"]())
    assert {"temperature, °C", "consumption, L/100 km"} <= set(words(ALL["cold"]()))
    assert {"mean speed, mi/h", "consumption, mpg (imperial)"} <= set(words(ALL["speed"]()))
    assert "share of the variance, %" in words(ALL["noise"]())


def test_the_target_is_always_in_sight_and_ranges_without_end_fill_the_drawing() -> None:
    for answer in (NOT_YET, SHIFTED, OUT_OF_REACH, replace(RAISED, looks=SHIFTED.looks)):
        assert funnel.reach_of(answer) > answer.target_percent
    assert NOT_YET.looks[0].interval_percent is None
    with canvas._figure(ALL["one look"]()) as figure:
        axes = figure.axes[0]
        (line,) = axes.collections[-1].get_segments()  # type: ignore[attr-defined]
        assert (line[0][1], line[1][1]) == axes.get_ylim()


def test_words_for_those_who_do_not_see_it() -> None:
    assert looked(NOT_YET).alternative == (
        "Shift of consumption with side skirts against distance driven with it, 5 looks over 2,150 km. At the last: "
        "-2.1 %, look-proof range -4.9 to +0.7 %. Target 3 %."
    )
    said = response.draw(COLD, VAN).alternative
    assert "9.25 L/100 km at -5 °C (range 9.05 L/100 km to 9.45 L/100 km)" in said
    assert noise.draw(scatter.sources(NOT_YET)).alternative.startswith("Shares of the variance of one segment: from")


def test_shares_add_up() -> None:
    shares = [source.share or 0.0 for source in scatter.sources(NOT_YET)]
    assert sum(shares) == pytest.approx(1.0)


def test_one_page_holds_the_same_drawing_twice() -> None:
    """Same drawing, same ids to begin with: each is its own afterwards, and refers to its own."""
    first, second = (ET.fromstring(embedded(ALL["shifted"](), name)) for name in ("a", "b"))
    ids = [{element.get("id") for element in root.iter() if element.get("id")} for root in (first, second)]
    assert ids[0]
    assert ids[0].isdisjoint(ids[1])
    for root, name, own in ((first, "a", ids[0]), (second, "b", ids[1])):
        referred = [value[1:] for element in root.iter() for key, value in element.attrib.items() if key == "href"]
        referred += [element.get("clip-path", "")[5:-1] for element in root.iter() if element.get("clip-path")]
        assert referred
        assert {*referred} <= own
        assert all(each.startswith(f"{name}-") for each in referred)


def test_black_and_white_are_left_to_the_page() -> None:
    text = embedded(ALL["shifted"](), "x")
    assert "#000000" not in text
    assert "#ffffff" not in text
    assert "currentColor" in text
    assert "var(--blue)" in text
    assert "<style" not in text, "a style sheet would hold for the whole page"
