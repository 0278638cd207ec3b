"""Blocks between the markers of a document."""

from __future__ import annotations

import re
from pathlib import Path

from tests.evidence.block import Block

DOCUMENT = Path(__file__).parent.parent.parent / "docs" / "evidence.md"
_END = "<!-- end -->"
_BLOCK = re.compile(r"<!-- measured: ([^\n]+) -->\n(.*?)" + re.escape(_END), re.DOTALL)


def measured(text: str) -> dict[str, str]:
    """Content of each block of a document by name."""
    return {name: content.strip() for name, content in _BLOCK.findall(text)}


def put(block: Block, path: Path) -> None:
    """Replace the block's content in a document. Raises ValueError where the document has no such block."""
    text = path.read_text(encoding="utf-8")
    opening = f"<!-- measured: {block.name} -->\n"
    before, marker, rest = text.partition(opening)
    if not marker or _END not in rest:
        raise ValueError(f"{path.name} has no block {block.name!r}: add {opening.strip()} and {_END}")
    after = rest[rest.index(_END) :]
    path.write_text(f"{before}{opening}{block.markdown()}\n{after}", encoding="utf-8")
