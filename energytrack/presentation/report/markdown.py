"""A page as Markdown (CommonMark, with the tables of its common extension); pictures are files beside it."""

from __future__ import annotations

import re
from collections.abc import Iterator
from urllib.parse import quote

from energytrack.presentation.report.page import Page, Picture, Section, Table
from energytrack.presentation.text import HARD_SPACE

_MEANT = re.compile(r"([\\`*_{}\[\]<>#|~&$]|^[-+=](?=\s|$))")
_NUMBERED = re.compile(r"^(\d+)([.)])(?=\s|$)")


def markdown(page: Page, folder: str) -> str:
    """The whole file; `folder`: of the pictures, as a link from the file leads to it."""
    lines = [f"# {escaped(page.title)}", "", escaped(page.made), ""]
    for chapter in page.chapters:
        lines += [f"## {escaped(chapter.heading)}", "", escaped(chapter.lead), ""]
        for section in chapter.sections:
            lines += _section(section, "###", folder)
    lines += _section(page.closing, "##", folder)
    return "\n".join(lines).rstrip("\n") + "\n"


def escaped(text: str) -> str:
    """Text on one line of which nothing is taken for markup."""
    return _NUMBERED.sub(r"\1\\\2", _MEANT.sub(r"\\\1", text.replace(HARD_SPACE, " ")))


def _section(section: Section, mark: str, folder: str) -> Iterator[str]:
    yield from (f"{mark} {escaped(section.heading)}", "")
    for text in section.texts:
        yield from (escaped(text), "")
    yield from (f"- {escaped(item)}" for item in section.items)
    if section.items:
        yield ""
    for picture in section.pictures:
        yield from (_picture(picture, folder), "", f"*{escaped(picture.caption)}*", "")
    for table in section.tables:
        yield from _table(table)


def _picture(picture: Picture, folder: str) -> str:
    return f"![{escaped(picture.drawing.alternative)}]({quote(f'{folder}/{picture.name}.svg')})"


def _table(table: Table) -> Iterator[str]:
    yield from (f"**{escaped(table.caption)}**", "", _row(table.head))
    under = "---:" if table.figures else "---"
    yield _joined(["---", *([under] * (len(table.head) - 1))])
    yield from map(_row, table.rows)
    yield ""


def _row(cells: tuple[str, ...]) -> str:
    return _joined([escaped(cell) for cell in cells])


def _joined(cells: list[str]) -> str:
    return f"| {' | '.join(cells)} |"
