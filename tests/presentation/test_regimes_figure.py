"""Changes nobody declared as a figure: readable by all, the same every time, nothing cut off."""

from __future__ import annotations

import re
import struct
import xml.etree.ElementTree as ET
from dataclasses import replace
from pathlib import Path

import pytest

from energytrack.errors import ReportError
from energytrack.presentation.graphics import canvas
from energytrack.presentation.graphics.writing import write
from energytrack.presentation.regimes.figure import draw
from energytrack.presentation.regimes.marks import Mark
from tests.presentation.regime_samples import IN_MILES, MARKS, NONE, TOO_FEW, TWICE, VAN, points

SVG = "{http://www.w3.org/2000/svg}"
MANY = [Mark(f"a part with a long name and a $price$ <tag> & more, {k}", 40_000.0 + 300 * k) for k in range(30)]


def test_an_element_that_a_page_can_hold_with_its_words() -> None:
    text = canvas.svg(draw(TWICE, VAN, MARKS))
    root = ET.fromstring(text)
    assert root.tag == f"{SVG}svg"
    assert root.get("role") == "img"
    said = root.get("aria-label") or ""
    assert "Consumption shifted twice: -5.4 % at about 48,900 km" in said
    assert "9.20 L/100 km from 40,000 km to 48,900 km" in said
    assert root.findtext(f"{SVG}title") == said
    words = [element.text for element in root.iter(f"{SVG}text")]
    assert "odometer, km" in words
    assert "consumption at reference conditions, L/100 km" in words
    assert {"one segment", "level of a regime", "its 95 % range", "change", "where it may lie"} <= set(words)
    assert "side skirts fitted, 48,900 km" in words


def test_the_same_bytes_every_time_without_a_date() -> None:
    first, second = (canvas.svg(draw(TWICE, VAN, MARKS)) for _ in range(2))
    assert first == second
    assert re.search(r"20\d\d-\d\d-\d\dT|<metadata|dc:date", first) is None
    assert canvas.png(draw(TWICE, VAN, MARKS)) == canvas.png(draw(TWICE, VAN, MARKS))


def test_a_users_own_settings_change_nothing() -> None:
    import matplotlib

    plain = canvas.svg(draw(TWICE, VAN, MARKS))
    with matplotlib.rc_context({"lines.linewidth": 9.0, "font.size": 30.0, "axes.facecolor": "black"}):
        assert canvas.svg(draw(TWICE, VAN, MARKS)) == plain
        assert matplotlib.rcParams["font.size"] == 30.0, "and they are left as they were"


def test_a_png_of_the_stated_size() -> None:
    data = canvas.png(draw(TWICE, VAN, MARKS))
    assert data.startswith(b"\x89PNG\r\n\x1a\n")  # PNG (W3C), section 5.2
    width, _ = struct.unpack(">II", data[16:24])
    assert width == 1200
    assert b"Consumption shifted twice" in data


@pytest.mark.parametrize("marks", [(), MARKS, MANY])
@pytest.mark.parametrize("vehicle", [VAN, IN_MILES])
def test_nothing_is_cut_off_or_lies_on_the_legend(marks: list[Mark], vehicle: object) -> None:
    drawing = draw(TWICE, vehicle, marks)  # type: ignore[arg-type]
    with canvas._figure(drawing) as figure:
        figure.draw_without_rendering()
        whole, used = figure.bbox_inches, figure.get_tightbbox()
        assert used.x0 >= whole.x0
        assert used.y0 >= whole.y0
        assert used.x1 <= whole.x1
        assert used.y1 <= whole.y1
        (axes,), (legend,) = figure.axes, figure.legends
        assert not legend.get_window_extent().overlaps(axes.get_tightbbox())
        assert axes.bbox.height > 0.35 * figure.bbox.height


def test_colours_are_those_of_the_palette() -> None:
    """Okabe and Ito (2008), "Color universal design": blue, vermilion, bluish green, black; values from memory."""
    rgb = {"BLUE": (0, 114, 178), "ORANGE": (213, 94, 0), "GREEN": (0, 158, 115), "BLACK": (0, 0, 0)}
    for name, value in rgb.items():
        assert getattr(canvas, name) == "#{:02X}{:02X}{:02X}".format(*value)
    used = set(re.findall(r"(?:fill|stroke): (#[0-9a-f]{6})", canvas.svg(draw(TWICE, VAN, MARKS))))
    assert used <= {"#0072b2", "#d55e00", "#009e73", "#000000", "#ffffff"}


def test_a_long_log_stays_small() -> None:
    long = canvas.svg(draw(replace(TWICE, points=points(20_000)), VAN))
    assert "mean of about 67 segments" in long
    assert len(long) < 200_000


def test_no_change_and_nothing_to_draw() -> None:
    words = [element.text for element in ET.fromstring(canvas.svg(draw(NONE, VAN))).iter(f"{SVG}text")]
    assert "change" not in words
    with pytest.raises(ReportError, match="nothing to draw for van: 7 segments"):
        draw(TOO_FEW, VAN)


def test_names_in_any_script(recwarn: pytest.WarningsRecorder) -> None:
    assert "側板" in canvas.svg(draw(TWICE, VAN, [Mark("側板", 50_000.0)]))
    assert canvas.png(draw(TWICE, VAN, [Mark("側板", 50_000.0)]))
    assert not recwarn.list


def test_a_file_is_only_replaced_when_told_to(tmp_path: Path) -> None:
    path = tmp_path / "van.svg"
    path.write_text("mine")
    with pytest.raises(ReportError, match=r"there already.*--force"):
        write(draw(TWICE, VAN), path)
    assert path.read_text() == "mine"
    write(draw(TWICE, VAN), path, force=True)
    assert ET.parse(path).getroot().tag == f"{SVG}svg"
