"""The cases of this folder: a flow file and, beside it, exactly what the program says of it.

`python -m tests.messages.cases` writes every expected.txt anew; look at the difference before keeping it.
"""

from __future__ import annotations

import contextlib
import io
import os
import random
import shlex
import shutil
import tempfile
import warnings
from collections.abc import Iterator
from pathlib import Path

FOLDER = Path(__file__).parent
COMMAND = "lint flow.yaml"


def case_names() -> list[str]:
    """Every folder with a flow file."""
    return sorted(flow.parent.name for flow in FOLDER.glob("*/flow.yaml"))


def outcome(name: str, folder: Path) -> str:
    """The exit status and all that the case's command prints, run in `folder`.

    The command is `lint flow.yaml` unless the case has a file command.txt.
    """
    from flowemu.cli import main

    case = FOLDER / name
    shutil.copy(case / "flow.yaml", folder)
    draw_layouts(folder)
    before = listing(folder)
    command = (case / "command.txt").read_text() if (case / "command.txt").exists() else COMMAND
    printed = io.StringIO()
    with contextlib.chdir(folder), contextlib.redirect_stdout(printed), contextlib.redirect_stderr(printed):
        status = main(shlex.split(command))
    left = "" if listing(folder) == before else "the folder was changed\n"
    return f"status {status}\n{left}{printed.getvalue()}"


def listing(folder: Path) -> list[tuple[str, int]]:
    """Every file in a folder with its size."""
    return sorted((str(p.relative_to(folder)), p.stat().st_size) for p in folder.rglob("*") if p.is_file())


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
    os.environ.pop("FLOWEMU_DEBUG", None)
    for name in case_names():
        with case_folder() as folder:
            (FOLDER / name / "expected.txt").write_text(outcome(name, folder))
            print(name)


if __name__ == "__main__":
    warnings.simplefilter("error")
    regenerate()
