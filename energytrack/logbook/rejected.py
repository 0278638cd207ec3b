"""Bad rows: told by line, or set aside in a file of their own."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from pathlib import Path

from energytrack.errors import EntryError
from energytrack.logbook.columns import Form
from energytrack.logbook.csvfile import open_csv
from energytrack.logbook.formulas import neutralised, restored
from energytrack.logbook.records import Problem
from energytrack.logbook.written import new_file

_NUMBER = re.compile(r"[+-]?[0-9.,]+")
_ADVICE = "nothing was imported; mend the file, or keep the good rows with --skip-bad rejected.csv"


class BadRowsError(EntryError):
    """Rows that cannot be imported, each with its line; nothing was written."""

    def __init__(self, file: str, problems: Sequence[Problem], advice: str = _ADVICE) -> None:
        self.problems = tuple(problems)
        lines = list(dict.fromkeys(str(problem.line) for problem in problems))
        if len(lines) == 1:
            told = "; ".join(problem.message for problem in problems)
            super().__init__(f"{file}:{lines[0]}: {told} ({advice})")
        else:
            shown = ", ".join(lines[:20]) + (", ..." if len(lines) > 20 else "")
            super().__init__(f"{file}: {len(lines)} bad rows, in lines {shown}; {advice}")


def _inert(cell: str) -> str:
    """Numbers stay as they are, -5 among them; whatever else a spreadsheet would run is made text, and read back."""
    return cell if _NUMBER.fullmatch(cell) else neutralised(restored(cell))


def write_rejected(target: Path, path: Path, form: Form, problems: Sequence[Problem]) -> None:
    """Copy the bad rows of `path` to the new file `target`, with their header and the column `reason`.

    Never overwrites and follows no link. Raises EntryError.
    """
    reasons: dict[int, str] = {}
    for problem in problems:
        if problem.line is not None:
            reasons[problem.line] = "; ".join(filter(None, (reasons.get(problem.line), problem.message)))
    table = open_csv(path, delimiter=form.delimiter, encoding=form.encoding)
    try:
        with new_file(target) as file:
            writer = csv.writer(file, delimiter=table.delimiter, lineterminator="\n")
            writer.writerow([*map(_inert, table.header), "reason"])
            writer.writerows([*map(_inert, cells), reasons[line]] for line, cells in table.rows() if line in reasons)
    except FileExistsError:
        raise EntryError(f"{target} exists already; name a new file for the rejected rows") from None
    except OSError as error:
        raise EntryError(f"{target} cannot be written: {error.strerror}; name another file") from None
