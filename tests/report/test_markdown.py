"""The report as Markdown, read by a CommonMark parser."""

from __future__ import annotations

import dataclasses
import itertools
from pathlib import Path
from urllib.parse import unquote

from markdown_it import MarkdownIt

from energytrack.inference.report.results import MonthReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation.report.figures import pictures_of, write_figures
from energytrack.presentation.report.markdown import escaped, markdown
from tests.report import logs

Found = list[tuple[Vehicle, MonthReport]]
READER = MarkdownIt("commonmark").enable("table")


def inline(text: str) -> list[object]:
    return list(itertools.chain.from_iterable(token.children or [] for token in READER.parse(text)))


def test_nothing_a_user_typed_is_markup(found: Found) -> None:
    text = markdown(logs.page(found), "figures")
    tokens = [*READER.parse(text), *inline(text)]
    kinds = {token.type for token in tokens}  # type: ignore[attr-defined]
    assert kinds.isdisjoint({"html_block", "html_inline", "link_open", "code_inline", "fence", "code_block"})
    said = "".join(token.content for token in inline(text))  # type: ignore[attr-defined]
    assert logs.PART in said
    assert logs.VAN in said


def test_tables_are_whole(found: Found) -> None:
    page = logs.page(found)
    tokens = READER.parse(markdown(page, "figures"))
    tables = [table for chapter in page.chapters for section in chapter.sections for table in section.tables]
    assert sum(token.type == "table_open" for token in tokens) == len(tables) > 12
    cells = sum(token.type == "td_open" for token in tokens)
    assert cells == sum(len(table.head) * len(table.rows) for table in tables)


def test_pictures_are_files_with_words(found: Found, tmp_path: Path) -> None:
    page, folder = logs.page(found), tmp_path / "my figures"
    written = write_figures(page, folder)
    images = [token for token in inline(markdown(page, folder.name)) if token.type == "image"]  # type: ignore[attr-defined]
    assert [tmp_path / unquote(str(image.attrs["src"])) for image in images] == written  # type: ignore[attr-defined]
    said = ["".join(part.content for part in image.children) for image in images]  # type: ignore[attr-defined]
    assert said == [picture.drawing.alternative for picture in pictures_of(page)]
    assert all(path.read_text(encoding="utf-8").startswith("<?xml") for path in written)
    assert len({path.name for path in written}) == len(written)


def test_marks_are_escaped_and_figures_are_not() -> None:
    for text in ("a | b", "*x*", "# x", "1. x", "- x", "<b>", "`x`", "[x](y)", "\\|", "&amp;", "~~x~~"):
        (paragraph,) = [token for token in READER.parse(escaped(text)) if token.type == "inline"]
        assert {child.type for child in paragraph.children or []} <= {"text", "text_special"}
        assert "".join(child.content for child in paragraph.children or []) == text
    assert escaped("-2.5 to +3.6 %, 8.4 L/100 km") == "-2.5 to +3.6 %, 8.4 L/100 km"


def test_a_page_without_anything_is_no_page_of_markup(found: Found) -> None:
    bare = dataclasses.replace(logs.page(found), chapters=())
    assert markdown(bare, "x").count("##") == 1
