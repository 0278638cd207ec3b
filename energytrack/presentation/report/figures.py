"""The figures of a page as files of their own."""

from __future__ import annotations

from pathlib import Path

from energytrack.errors import ReportError
from energytrack.presentation.graphics import writing
from energytrack.presentation.report.page import Page, Picture


def pictures_of(page: Page) -> list[Picture]:
    """In the order they are shown."""
    return [each for chapter in page.chapters for section in chapter.sections for each in section.pictures]


def write_figures(page: Page, folder: Path, *, force: bool = False) -> list[Path]:
    """SVG files in a folder, made if it is not there; none is written where one is there already, without `force`.

    Raises ReportError.
    """
    paths = [folder / f"{picture.name}.svg" for picture in pictures_of(page)]
    try:
        folder.mkdir(mode=0o700, exist_ok=True)
    except OSError as failure:
        raise ReportError(f"cannot make the folder {folder}: {failure.strerror}; name another") from None
    for path in paths:
        writing.check(path, force=force)
    for picture, path in zip(pictures_of(page), paths, strict=True):
        writing.write(picture.drawing, path, force=force)
    return paths
