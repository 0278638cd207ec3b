"""A drawing as an SVG element that shares a page with others, in the colours of the page."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET

from energytrack.presentation.graphics import canvas
from energytrack.presentation.graphics.canvas import BLUE, GREEN, ORANGE, Drawing

_REFERENCE = re.compile(r"url\(#([^)]+)\)")
_SIZES = ("width", "height")  # in points: the page decides
_OF_THE_PAGE = {
    "stroke: #000000": "stroke: currentColor",
    "fill: #ffffff": "fill: none",
    **{colour.lower(): f"var(--{name})" for name, colour in (("blue", BLUE), ("orange", ORANGE), ("green", GREEN))},
}


def embedded(drawing: Drawing, name: str) -> str:
    """The element, its text escaped. No id of it is on the page twice, where no two drawings have one `name`.

    Black becomes the page's colour of text, white is left out, and the page says which blue, orange and green can be
    told from its paper, light or dark.
    """
    root = ET.fromstring(canvas.svg(drawing))
    for parent in root.iter():
        for child in [each for each in parent if _local(each.tag) in ("style", "metadata")]:
            parent.remove(child)  # a style sheet in a page holds for all of the page
    used = set(_references(root))
    for element in root.iter():
        element.tag = _local(element.tag)
        for key, value in list(element.attrib.items()):
            del element.attrib[key]
            if key != "id" or value in used:
                element.set(_local(key), _own(_local(key), value, name))
    for size in _SIZES:
        root.attrib.pop(size, None)
    return ET.tostring(root, encoding="unicode")


def _local(tag: str) -> str:
    """The name without its namespace: in HTML the element itself says which it is."""
    return tag.rpartition("}")[2]


def _references(root: ET.Element) -> list[str]:
    found: list[str] = []
    for element in root.iter():
        for key, value in element.attrib.items():
            found += [value[1:]] if _local(key) == "href" else _REFERENCE.findall(value)
    return found


def _own(key: str, value: str, name: str) -> str:
    if key == "id":
        return f"{name}-{value}"
    if key == "href":
        return f"#{name}-{value[1:]}"
    if key == "style":
        for drawn, shown in _OF_THE_PAGE.items():
            value = value.replace(drawn, shown)
    return _REFERENCE.sub(rf"url(#{name}-\1)", value) if key in ("style", "clip-path") else value
