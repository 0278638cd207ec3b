"""`python -m tests.refresh_docs`: rewrite the outputs shown in the documents. Read the difference before committing."""

from __future__ import annotations

import tempfile
from pathlib import Path

from tests.documents import DOCUMENTS, ROOT, replay


def refresh() -> None:
    """Every document whose outputs differ is written anew."""
    for name in DOCUMENTS:
        path = ROOT / name
        text = path.read_text(encoding="utf-8")
        with tempfile.TemporaryDirectory() as folder:
            replayed = replay(text, Path(folder))
        if replayed != text:
            path.write_text(replayed, encoding="utf-8")
            print(f"{name}: rewritten")


if __name__ == "__main__":
    refresh()
