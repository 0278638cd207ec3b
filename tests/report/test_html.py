"""The page by the rules of HTML, by its own rules, and against names that mean mischief."""

from __future__ import annotations

import datetime as dt
import itertools
import re
import xml.etree.ElementTree as ET
from collections import Counter

import html5lib
import pytest

from energytrack.inference.fleet.results import FleetAssessment
from energytrack.inference.report.results import MonthReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation.report.html import html
from tests.report import logs

Found = list[tuple[Vehicle, MonthReport]]


@pytest.fixture(scope="module")
def root(text: str) -> ET.Element:
    """Parsed by the HTML standard's algorithm; a parse error is a failure."""
    parser = html5lib.HTMLParser(strict=True, namespaceHTMLElements=False)
    return parser.parse(text)


def local(element: ET.Element) -> str:
    return str(element.tag).rpartition("}")[2]


def every(root: ET.Element, name: str) -> list[ET.Element]:
    return [element for element in root.iter() if local(element) == name]


def words(element: ET.Element) -> str:
    return " ".join("".join(element.itertext()).split())


def test_a_stray_tag_would_be_a_failure() -> None:
    with pytest.raises(html5lib.html5parser.ParseError):
        html5lib.HTMLParser(strict=True).parse("<!DOCTYPE html><title>t</title><p><b>x</p>")


def test_language_title_and_headings_in_order(root: ET.Element) -> None:
    assert root.get("lang") == "en"
    assert words(every(root, "title")[0]).startswith("Energy use, 2025-")
    levels = [int(local(each)[1]) for each in root.iter() if re.fullmatch("h[1-6]", local(each))]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(after <= before + 1 for before, after in itertools.pairwise(levels))


def test_tables_have_captions_and_every_heading_its_scope(root: ET.Element) -> None:
    tables = every(root, "table")
    assert len(tables) > 12
    for table in tables:
        assert local(table[0]) == "caption"
        assert words(table[0])
        assert [each.get("scope") for each in every(table, "th")].count(None) == 0
        counts = {len(list(row)) for row in every(table, "tr")}
        assert len(counts) == 1, "a cell is missing"


def test_figures_say_what_they_show(root: ET.Element) -> None:
    pictures = every(root, "svg")
    names = [each for each in every(root, "figure") if every(each, "figcaption") and every(each, "svg")]
    assert len(pictures) == len(names) == 9  # odometer, test, two curves, noise; the other has no test
    for picture in pictures:
        assert picture.get("role") == "img"
        assert picture.get("aria-label") == words(every(picture, "title")[0]) != ""


def test_nothing_is_fetched_and_nothing_runs(text: str, root: ET.Element) -> None:
    assert not [each for each in root.iter() if local(each) in ("script", "link", "iframe", "img", "object", "base")]
    for element in root.iter():
        for key, value in element.attrib.items():
            assert not str(key).startswith("on"), "an event handler"
            if str(key).rpartition("}")[2] in ("src", "href"):
                assert value.startswith("#")
    assert re.findall(r"url\((?!#)|@import|https?://|javascript:(?!b)", text) == []


def test_ids_are_there_once_and_whatever_is_referred_to_is_there(text: str, root: ET.Element) -> None:
    ids = Counter(element.get("id") for element in root.iter() if element.get("id"))
    assert len(ids) > 9
    assert max(ids.values()) == 1
    referred = set(re.findall(r'(?:url\(|href=")#([^")]+)', text))
    assert referred
    assert referred <= set(ids)


def test_names_are_shown_as_they_were_typed(text: str, root: ET.Element) -> None:
    shown = words(root)
    assert logs.VAN in shown
    assert logs.PART in shown, "and no template is run in it"
    assert logs.WHAT in shown
    assert "<script" not in text.lower()
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in text


def test_the_same_bytes_every_time_and_only_the_stated_day_changes(
    found: Found, fleet: FleetAssessment, text: str
) -> None:
    assert html(logs.page(found, fleet=fleet)) == text
    later = html(logs.page(found, dt.date(2026, 2, 3), fleet))
    changed = [(a, b) for a, b in zip(text.splitlines(), later.splitlines(), strict=True) if a != b]
    assert [re.findall(r"\d{4}-\d\d-\d\d", b) for _, b in changed] == [["2026-02-03"]]


def test_several_vehicles_stand_together_first(root: ET.Element, fleet: FleetAssessment) -> None:
    articles = every(root, "article")
    assert articles[0].get("id") == "all-vehicles"
    assert len(articles) == 3
    (table,) = every(articles[0], "table")
    names = [words(each) for each in every(table, "th") if each.get("scope") == "row"]
    assert names == [each.vehicle for each in fleet.vehicles]
    assert {*names} == {logs.VAN, logs.OTHER}
    assert [link.get("href") for link in every(root, "a")] == [f"#{each.get('id')}" for each in articles]


def test_it_says_what_the_review_says(root: ET.Element, found: Found) -> None:
    shown = words(root)
    (_, van), _ = found
    shift = van.tried[0].answer.shift_percent
    assert shift is not None
    assert abs(shift + 8.0) < 1.5, "what was put into the log"
    assert f"lowered consumption by {-shift:.1f} %" in shown.replace("\u00a0", " ")
    assert "What to do next" in shown
    assert "A statistical verdict is not an approval of the part." in shown
