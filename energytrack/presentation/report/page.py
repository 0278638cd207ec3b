"""What a page is made of, whatever it is written as. Texts are plain, as users typed them: a writer escapes them."""

from __future__ import annotations

from dataclasses import dataclass, field

from energytrack.presentation.graphics.canvas import Drawing

Row = tuple[str, ...]


@dataclass(frozen=True)
class Table:
    """Rows below a heading row; the first cell of a row is its heading."""

    caption: str
    head: Row  # an empty first cell where the rows' headings need no name
    rows: tuple[Row, ...]
    figures: bool = False  # cells are numbers to be read down the column


@dataclass(frozen=True)
class Picture:
    """A drawing with what stands below it; `name` is unlike that of any other on the page."""

    name: str
    drawing: Drawing
    caption: str


@dataclass(frozen=True)
class Section:
    """Shown in this order."""

    heading: str
    texts: tuple[str, ...] = ()
    items: tuple[str, ...] = ()
    pictures: tuple[Picture, ...] = ()
    tables: tuple[Table, ...] = ()


@dataclass(frozen=True)
class Chapter:
    """One vehicle."""

    name: str  # unlike that of any other on the page, without spaces
    heading: str
    lead: str
    sections: tuple[Section, ...]


@dataclass(frozen=True)
class Page:
    """A title, when and from what it was made, a chapter a vehicle, and what holds for all."""

    title: str
    made: str
    chapters: tuple[Chapter, ...]
    closing: Section = field(default_factory=lambda: Section(""))
