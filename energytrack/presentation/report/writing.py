"""A report to its file: whole or not at all, readable by its owner alone, and over nothing unless told to."""

from __future__ import annotations

import os
from pathlib import Path

from energytrack.errors import ReportError
from energytrack.presentation.placing import place, refuse_link, taken

ENDINGS = {"html": (".html", ".htm"), "md": (".md", ".markdown")}


def check(path: Path, form: str, *, force: bool = False) -> None:
    """Raises ReportError where `write` could not write a report of this form (html or md) to this file."""
    if path.suffix.lower() not in ENDINGS[form]:
        raise ReportError(f"cannot write a report to {path}: name a file that ends in {' or '.join(ENDINGS[form])}")
    refuse_link(path)
    if path.is_dir():
        raise ReportError(f"cannot write {path}: it is a folder; name a file")
    if path.exists() and not force:
        raise ReportError(taken(path))
    if not path.absolute().parent.is_dir():
        raise ReportError(f"cannot write {path}: {path.parent} is no folder; make it first, or name another")
    if not os.access(path.absolute().parent, os.W_OK):
        raise ReportError(f"cannot write {path}: its folder cannot be written to; name another place")


def write(text: str, path: Path, form: str, *, force: bool = False) -> None:
    """Write to a new file, or over an earlier one with `force`. Raises ReportError."""
    check(path, form, force=force)
    place(text.encode(), path, force=force)


def check_folder(folder: Path) -> None:
    """Raises ReportError where figures could not be written to a folder of this name."""
    refuse_link(folder)
    if folder.exists() and not folder.is_dir():
        raise ReportError(f"cannot write figures to {folder}: it is no folder; name another")
    if not folder.absolute().parent.is_dir():
        raise ReportError(f"cannot write figures to {folder}: {folder.parent} is no folder; make it first")
