"""A CSV file as rows of text: encoding, delimiter and bounds. RFC 4180, with what spreadsheets make of it."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TextIO

from energytrack.errors import EntryError
from energytrack.logbook.formulas import restored
from energytrack.logbook.records import Problem

DELIMITERS = (",", ";", "\t")
COLUMN_LIMIT = 1000
HEADER_LIMIT = 1000  # lines; a file of nothing but empty ones is not read to its end
LINE_LIMIT = 1_000_000  # characters, of a line and of a row; a cell is bounded by the csv module at 131,072
_PACKED = {  # how files begin that hold others, by their formats' descriptions
    b"\x1f\x8b": "gzip",
    b"PK\x03\x04": "zip, or a spreadsheet's own format",
    b"BZh": "bzip2",
    b"\xfd7zXZ\x00": "xz",
    b"7z\xbc\xaf": "7z",
    b"\x28\xb5\x2f\xfd": "zstd",
    b"\xd0\xcf\x11\xe0": "a spreadsheet's own format",
}


class UnreadableTableError(EntryError):
    """The file cannot be read as a table, from `problem.line` on or at all."""

    def __init__(self, problem: Problem) -> None:
        super().__init__(str(problem))
        self.problem = problem


@dataclass(frozen=True, slots=True)
class CsvFile:
    """A file whose header has been read; `rows` streams the rest."""

    path: Path
    encoding: str
    delimiter: str
    header: tuple[str, ...]

    def rows(self) -> Iterator[tuple[int, list[str]]]:
        """Non-empty rows below the header, each with the line it starts on. Raises UnreadableTableError."""
        rows = _rows(self.path, self.encoding, self.delimiter)
        next(rows, None)
        return rows


def open_csv(path: Path, *, delimiter: str | None = None, encoding: str | None = None) -> CsvFile:
    """Find out how the file is written and read its header. Raises UnreadableTableError."""
    if not path.is_file():
        reason = "is not a plain file" if path.exists() else "does not exist; give the path of a CSV file"
        raise UnreadableTableError(Problem(reason, str(path)))
    _refuse_packed(path)
    encoding = _named(path, encoding) if encoding else _detected(path)
    if delimiter is None:
        delimiter = max(DELIMITERS, key=lambda mark: _width(path, encoding, mark))
    if len(delimiter) != 1 or delimiter in '"\r\n':
        advice = f"{delimiter!r} cannot be a delimiter; give one character, or tab"
        raise UnreadableTableError(Problem(advice, str(path)))
    first = next(_rows(path, encoding, delimiter), None)
    if first is None:
        raise UnreadableTableError(Problem("is empty; the first line must name the columns", str(path)))
    return CsvFile(path, encoding, delimiter, tuple(restored(cell.strip()) for cell in first[1]))


def _refuse_packed(path: Path) -> None:
    """Nothing is ever unpacked: a small file may hold any amount."""
    try:
        with path.open("rb") as file:
            begins = file.read(8)
    except OSError as error:
        raise UnreadableTableError(Problem(f"cannot be read: {error.strerror}", str(path))) from None
    for mark, what in _PACKED.items():
        if begins.startswith(mark):
            raise UnreadableTableError(Problem(f"is packed ({what}); unpack it, or save it as CSV", str(path)))


def _named(path: Path, encoding: str) -> str:
    try:
        with path.open(encoding=encoding):
            pass
    except (LookupError, ValueError):
        raise UnreadableTableError(
            Problem(f"{encoding!r} is no text encoding; give utf-8, latin-1, cp1252, ...", str(path))
        ) from None
    except OSError as error:
        raise UnreadableTableError(Problem(f"cannot be read: {error.strerror}", str(path))) from None
    return "utf-8-sig" if encoding.lower().replace("_", "-") in ("utf-8", "utf8") else encoding


def _detected(path: Path) -> str:
    """UTF-8 where the whole file is; else Windows-1252, and latin-1 for the bytes that one leaves undefined."""
    for encoding in ("utf-8-sig", "cp1252"):
        try:
            with path.open(encoding=encoding, newline="") as file:
                while file.read(1 << 20):
                    pass
        except UnicodeDecodeError:
            continue
        except OSError as error:
            raise UnreadableTableError(Problem(f"cannot be read: {error.strerror}", str(path))) from None
        return encoding
    return "latin-1"


def _width(path: Path, encoding: str, delimiter: str) -> int:
    try:
        first = next(_rows(path, encoding, delimiter), None)
    except UnreadableTableError:  # quoted cells read with another delimiter than theirs
        return 0
    return len(first[1]) if first else 0


def _rows(path: Path, encoding: str, delimiter: str) -> Iterator[tuple[int, list[str]]]:
    """Every non-empty row, the header among them."""

    def refused(line: int, message: str) -> UnreadableTableError:
        return UnreadableTableError(Problem(message, str(path), line))

    try:
        with path.open(encoding=encoding, newline="") as file:
            lines = BoundedLines(file, path)
            reader = csv.reader(lines, delimiter=delimiter, strict=True)
            start, has_header = 1, False
            try:
                for row in reader:
                    if len(row) > COLUMN_LIMIT:
                        raise refused(start, f"{len(row)} columns are too many; keep at most {COLUMN_LIMIT}")
                    if any(row):
                        has_header = True
                        yield start, row
                    elif not has_header and start >= HEADER_LIMIT:
                        raise refused(1, f"has no header in its first {HEADER_LIMIT:,} lines; name the columns there")
                    start = reader.line_num + 1
                    lines.left = LINE_LIMIT
            except csv.Error as error:
                raise refused(start, _meaning(str(error))) from None
    except OSError as error:
        raise UnreadableTableError(Problem(f"cannot be read: {error.strerror}", str(path))) from None
    except UnicodeError:
        advice = f"is not written in {encoding.removesuffix('-sig')}; leave --encoding out"
        raise UnreadableTableError(Problem(advice, str(path))) from None


class BoundedLines:
    """The lines of a file; a row that is endless, or a binary file, ends the reading before it fills the memory."""

    def __init__(self, file: TextIO, path: Path) -> None:
        self.left = LINE_LIMIT  # characters of this row; who reads rows of several lines sets it after each
        self._file, self._path = file, path

    def __iter__(self) -> Iterator[str]:
        number = 0
        while line := self._file.readline(self.left + 1):
            number += 1
            self.left -= len(line)
            if self.left < 0:
                raise self._refused(f"a row of more than {LINE_LIMIT:,} characters is no table row", number)
            if "\0" in line:
                advice = "contains a NUL byte: a binary file, or UTF-16; save it as CSV in UTF-8"
                raise self._refused(advice, number)
            yield line

    def _refused(self, message: str, number: int) -> UnreadableTableError:
        return UnreadableTableError(Problem(message, str(self._path), number))


def _meaning(error: str) -> str:
    if "unexpected end" in error:
        return 'a quote (") is opened in this row and never closed; close it, or write it twice inside a cell'
    if "field larger" in error:
        return f'a cell of more than {csv.field_size_limit():,} characters; is a quote (") in this row never closed?'
    return f'the quotes in this row do not pair up ({error}); write a quote inside a cell twice ("")'
