"""Documents whose commands are run: what they print must be what the document shows.

    ```csv notes.csv        a file, written before the commands below it run; any language will do
    ```console
    $ a command             run in one temporary folder per document, demo_logbook/ beside it
    its output
    ```
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).parent.parent
DOCUMENTS = ("README.md", "DEVELOPERS.md", *sorted(f"docs/{path.name}" for path in (ROOT / "docs").glob("*.md")))
WIDTH = 80
_FENCE, _CONSOLE, _PROMPT = "```", "```console", "$ "


class FailedCommandError(Exception):
    """A command of a document that ended with another status than 0."""


def replay(text: str, folder: Path) -> str:
    """The document with every output as its commands print it now. Raises FailedCommandError."""
    shutil.copytree(ROOT / "demo_logbook", folder / "demo_logbook")
    environment = _environment(folder / ".bin")
    lines = iter(text.splitlines())
    replayed: list[str] = []
    for line in lines:
        replayed.append(line)
        if not line.startswith(_FENCE):
            continue
        block = _rest_of_block(lines)
        if line == _CONSOLE:
            for command in commands_of(block):
                replayed += [_PROMPT + command, *_run(command, folder, environment)]
        else:
            _write(line, block, folder)
            replayed += block
        replayed.append(_FENCE)
    return "\n".join(replayed) + "\n"


def commands_of(lines: list[str]) -> list[str]:
    """The commands among the lines of a console block."""
    return [line.removeprefix(_PROMPT) for line in lines if line.startswith(_PROMPT)]


def console_lines(text: str) -> list[str]:
    """All lines inside console blocks."""
    lines = iter(text.splitlines())
    found: list[str] = []
    for line in lines:
        if line.startswith(_FENCE):
            block = _rest_of_block(lines)
            found += block if line == _CONSOLE else []
    return found


def _rest_of_block(lines: Iterator[str]) -> list[str]:
    block: list[str] = []
    for line in lines:
        if line == _FENCE:
            return block
        block.append(line)
    raise ValueError("a fenced block is not closed")


def _write(fence: str, block: list[str], folder: Path) -> None:
    """A block whose opening fence names a file becomes that file."""
    words = fence.removeprefix(_FENCE).split()
    if len(words) == 2:
        (folder / words[1]).write_text("\n".join(block) + "\n", encoding="utf-8")


def _run(command: str, folder: Path, environment: dict[str, str]) -> list[str]:
    if command.startswith("export "):  # of the shell a reader types into: holds for the commands below
        name, _, value = command.removeprefix("export ").partition("=")
        environment[name] = value
        return []
    done = subprocess.run(
        command, shell=True, cwd=folder, env=environment, text=True, encoding="utf-8",
        stdin=subprocess.DEVNULL, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, timeout=300, check=False,
    )  # fmt: skip
    if done.returncode:
        raise FailedCommandError(f"{command!r} ended with status {done.returncode}:\n{done.stdout}")
    return [line.rstrip() for line in done.stdout.rstrip("\n").splitlines()]


def _environment(scripts: Path) -> dict[str, str]:
    """This project's command on the PATH whether or not it is installed, 80 columns, no logbook named."""
    scripts.mkdir()
    script = scripts / "energytrack"
    start = "from energytrack.cli.app import main\n\nif __name__ == '__main__':\n    main()\n"
    script.write_text(f"#!{sys.executable}\n{start}", encoding="utf-8")
    script.chmod(0o755)
    kept = {name: value for name, value in os.environ.items() if not name.startswith("ENERGYTRACK_")}
    path = os.pathsep.join([str(scripts), str(Path(sys.executable).parent), os.environ["PATH"]])
    return {**kept, "PATH": path, "PYTHONPATH": str(ROOT), "COLUMNS": str(WIDTH), "PYTHONUTF8": "1"}
