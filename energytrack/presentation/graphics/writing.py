"""A drawing to a file, named .svg or .png."""

from __future__ import annotations

from pathlib import Path

from energytrack.errors import ReportError
from energytrack.presentation.graphics import canvas
from energytrack.presentation.placing import place, refuse_link, taken

_PROLOGUE = '<?xml version="1.0" encoding="utf-8"?>\n'


def check(path: Path, *, force: bool = False) -> None:
    """Raises ReportError where `write` could not draw to this file."""
    if path.suffix.lower() not in (".svg", ".png"):
        raise ReportError(f"cannot draw to {path}: name a file that ends in .svg or .png")
    refuse_link(path)
    if path.is_dir() or (path.exists() and not force):
        raise ReportError(_taken(path))
    if not path.parent.is_dir():
        raise ReportError(f"cannot write {path}: {path.parent} is no folder; make it first, or name another")
    canvas.need_matplotlib()


def write(drawing: canvas.Drawing, path: Path, *, force: bool = False) -> None:
    """Draw to a new file, or over an earlier one with `force`. Raises ReportError."""
    check(path, force=force)
    data = canvas.png(drawing) if path.suffix.lower() == ".png" else (_PROLOGUE + canvas.svg(drawing)).encode()
    place(data, path, force=force)


def _taken(path: Path) -> str:
    if path.is_dir():
        return f"cannot write {path}: it is a folder; name a file"
    return taken(path)
