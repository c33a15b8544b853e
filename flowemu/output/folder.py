"""The output folder: checked before a run, filled at its end, never with a file half-written."""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from pathlib import Path

from flowemu.errors import RunError

DEFAULT = "outputs"
LIST = ".flowemu.json"


def prepare_folder(out: str | None, flow_file: Path) -> Path:
    """The folder for a flow's results: `out`, or `outputs/` and the flow file's stem under the working directory.

    Raises
    ------
    RunError
        It cannot be written; nothing has been made yet.
    """
    folder = Path(out) if out else Path(DEFAULT) / Path(flow_file).stem
    check_writable(folder)
    return folder


def check_writable(folder: Path) -> None:
    """Raise a RunError unless the folder, or the nearest one above it that exists, takes a file."""
    nearest = folder
    try:
        while not nearest.exists():
            nearest = nearest.parent if nearest.parent != nearest else Path()
        if not nearest.is_dir():
            raise RunError(f"cannot write to {folder}: {nearest} is not a folder")
        with tempfile.TemporaryFile(dir=nearest):
            pass
    except OSError as error:
        raise RunError(f"cannot write to {folder}: {error.strerror or error}") from error


@contextmanager
def staged(folder: Path, owner: str) -> Iterator[Path]:
    """A folder beside `folder` to write into; its files move over when all are done, or none does.

    Files that the same owner (`run`, `section`, `mesh`) left there before and did not write again are
    removed; files of others stay.
    """
    try:
        folder.parent.mkdir(parents=True, exist_ok=True)
        staging = Path(tempfile.mkdtemp(prefix=f".{folder.name}-", dir=folder.parent))
    except OSError as error:
        raise RunError(f"cannot write to {folder}: {error.strerror or error}") from error
    try:
        yield staging
        move_over(staging, folder, owner)
    except OSError as error:
        raise RunError(f"cannot write to {folder}: {error.strerror or error}") from error
    finally:
        shutil.rmtree(staging, ignore_errors=True)


def move_over(staging: Path, folder: Path, owner: str) -> None:
    """Replace file by file, each in one move, then remove what the owner wrote earlier and not now."""
    made = sorted(path.relative_to(staging).as_posix() for path in staging.rglob("*") if path.is_file())
    folder.mkdir(parents=True, exist_ok=True)
    lists = read_lists(folder)
    stale = set(lists.get(owner, [])) - set(made)
    lists[owner] = made
    kept_elsewhere = {name for other, names in lists.items() if other != owner for name in names}
    for name in made:
        (folder / name).parent.mkdir(parents=True, exist_ok=True)
        os.replace(staging / name, folder / name)
    remove_files(folder, stale - kept_elsewhere)
    write_text(folder / LIST, json.dumps(lists, indent=1, sort_keys=True) + "\n")


def read_lists(folder: Path) -> dict[str, list[str]]:
    """Which files each owner wrote here before; nothing if that is not known."""
    try:
        lists = json.loads((folder / LIST).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    if not isinstance(lists, dict):
        return {}
    return {str(owner): [str(name) for name in names] for owner, names in lists.items() if isinstance(names, list)}


def remove_files(folder: Path, names: Iterable[str]) -> None:
    """Remove files inside the folder, and the folders below it that are then empty."""
    inside = folder.resolve()
    for name in names:
        path = (folder / name).resolve()
        if inside not in path.parents:
            continue
        path.unlink(missing_ok=True)
        for above in path.parents:
            if above == inside or any(above.iterdir()):
                break
            above.rmdir()


def write_text(path: Path, text: str) -> None:
    """Write a file in one move, so that nobody ever reads half of it."""
    with tempfile.NamedTemporaryFile("w", encoding="utf-8", dir=path.parent, prefix=".", delete=False) as file:
        file.write(text)
    try:
        os.chmod(file.name, 0o644)
        os.replace(file.name, path)
    except OSError:
        Path(file.name).unlink(missing_ok=True)
        raise
