"""The cases of this folder: a flow file and, beside it, exactly what the program says of it.

`python -m tests.messages.cases` writes every expected.txt anew; look at the difference before keeping it.
"""

from __future__ import annotations

import contextlib
import io
import os
import random
import re
import shlex
import shutil
import tempfile
import warnings
from collections.abc import Iterator
from pathlib import Path

FOLDER = Path(__file__).parent
COMMAND = "lint flow.yaml"
PROGRESS = re.compile(r"^\d+/\d+ .*\n", re.MULTILINE)
MEMORY = 8 * 2**30  # bytes: a machine of known size, for what is said of grids that are too large


def case_names() -> list[str]:
    """Every folder with a flow file."""
    return sorted(flow.parent.name for flow in FOLDER.glob("*/flow.yaml"))


def command_of(name: str) -> str:
    """What a case runs: `lint flow.yaml` unless it has a file command.txt."""
    file = FOLDER / name / "command.txt"
    return file.read_text().strip() if file.exists() else COMMAND


def outcome(name: str, folder: Path, command: str | None = None) -> str:
    """The exit status and all that a case's command, or another one, prints in `folder`, progress left out."""
    from flowemu.cli import main

    shutil.copy(FOLDER / name / "flow.yaml", folder)
    draw_layouts(folder)
    before = listing(folder)
    printed = io.StringIO()
    with contextlib.chdir(folder), contextlib.redirect_stdout(printed), contextlib.redirect_stderr(printed):
        status = main(shlex.split(command or command_of(name)))
    left = "" if listing(folder) == before else "the folder was changed\n"
    return f"status {status}\n{left}{PROGRESS.sub('', printed.getvalue())}"


def listing(folder: Path) -> list[tuple[str, bytes | None]]:
    """Every file in a folder with its content, and every folder in it."""
    return sorted((str(p.relative_to(folder)), p.read_bytes() if p.is_file() else None) for p in folder.rglob("*"))


def draw_layouts(folder: Path) -> None:
    """A small die with two top cells, and files that are damaged in the usual ways."""
    import gdstk

    library = gdstk.Library("messages", unit=1e-6, precision=1e-9)
    die, lid = library.new_cell("die"), library.new_cell("lid")
    die.add(gdstk.rectangle((-20, -20), (20, 20), layer=11), gdstk.rectangle((-4, -4), (4, 4), layer=10))
    lid.add(gdstk.rectangle((-20, -20), (20, 20), layer=12))
    library.write_gds(folder / "die.gds")
    whole = (folder / "die.gds").read_bytes()
    (folder / "truncated.gds").write_bytes(whole[: len(whole) // 2])
    (folder / "random.gds").write_bytes(random.Random(7).randbytes(600))
    (folder / "empty.gds").write_bytes(b"")
    (folder / "text.gds").write_text("This is a note about a layout.\n")


@contextlib.contextmanager
def case_folder() -> Iterator[Path]:
    """A project folder of its own for one case."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name) / "project"
        folder.mkdir()
        (folder / "pyproject.toml").write_text("")
        yield folder


def regenerate() -> None:
    """Writes every expected.txt."""
    from flowemu.engine import memory

    os.environ.pop("FLOWEMU_DEBUG", None)
    memory.machine_memory = lambda: MEMORY
    for name in case_names():
        with case_folder() as folder:
            (FOLDER / name / "expected.txt").write_text(outcome(name, folder))
            print(name)


if __name__ == "__main__":
    warnings.simplefilter("error")
    regenerate()
