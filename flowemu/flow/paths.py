"""Which files a flow may name: those of its own project folder."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from flowemu.errors import hint
from flowemu.flow.quantities import shape

ROOT_MARKS = ("pyproject.toml", ".git")
LAYOUT_ENDINGS = (".gds", ".gdsii", ".gds2", ".oas", ".oasis")


def project_folder(flow_file: Path) -> Path:
    """The nearest folder upward that holds a pyproject.toml or .git; else the flow file's own."""
    own = flow_file.resolve().parent
    for folder in (own, *own.parents):
        if any((folder / mark).exists() for mark in ROOT_MARKS):
            return folder
    return own


def named_file(flow_file: Path, name: str, allow: Iterable[Path]) -> Path:
    """The file that a flow means by `name`, links followed.

    Raises
    ------
    ValueError
        Where it leaves the project folder and the allowed ones, or is not a file.
    """
    if not name.strip() or "\0" in name:
        raise ValueError(f"expected a file, found {shape(name)}")
    path = (flow_file.resolve().parent / name).resolve()
    project = project_folder(flow_file)
    if not any(path.is_relative_to(folder) for folder in (project, *(Path(a).resolve() for a in allow))):
        raise ValueError(f"'{name}' leaves the project folder '{project.name}'; --allow DIR admits another")
    if path.is_dir():
        raise ValueError(f"'{name}' is a folder; expected a file")
    if not path.exists():
        raise ValueError(f"there is no file '{name}'{_others(path)}")
    return path


def _others(path: Path) -> str:
    if not path.parent.is_dir():
        return f"; there is no folder '{path.parent.name}' either"
    names = sorted(p.name for p in path.parent.iterdir() if p.suffix.lower() in LAYOUT_ENDINGS)
    return hint(path.name, names[:8], "in that folder are")
