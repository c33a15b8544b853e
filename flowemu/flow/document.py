"""A text file as plain data that knows where each key and value stands."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from flowemu.errors import Fault

Path = tuple[str | int, ...]


@dataclass(frozen=True)
class Mark:
    """Where an entry's key and its value begin; lines and columns from 1. An element of a list is its own key."""

    key: tuple[int, int]
    value: tuple[int, int]


@dataclass(frozen=True, eq=False)
class Document:
    """The data of a file, and the place of everything in it.

    Attributes
    ----------
    file : str
        The file as the user named it; complaints begin with it.
    data : dict
        Mappings, lists and texts only; None for an empty value. Scalars stay text: what they mean is for the models
        to say.
    marks : mapping of path to Mark
        A path is the keys and list indexes (from 0) that lead to an entry.
    """

    file: str
    data: dict[str, Any]
    marks: Mapping[Path, Mark]

    def known(self, path: Sequence[str | int]) -> Path:
        """The entry that `path` means: what does not stand in the file, such as an optional level, is skipped."""
        found: Path = ()
        for part in path:
            if (*found, part) in self.marks:
                found = (*found, part)
        return found

    def fault(self, path: Sequence[str | int], text: str, at_key: bool = False) -> Fault:
        """A complaint about the entry at `path`, placed at its value, or at its key."""
        mark = self.marks.get(self.known(path))
        if mark is None:
            return Fault(self.file, 1, 1, text)
        line, column = mark.key if at_key else mark.value
        return Fault(self.file, line, column, text)

    def name_of(self, path: Sequence[str | int]) -> str:
        """The entry as a reader would write it: `expect[2].thickness`, `step 4 (etch): rates.psg`."""
        found = self.known(path)
        if len(found) > 2 and found[0] == "steps" and isinstance(found[1], int):
            inside = joined(found[3:])
            return f"step {found[1] + 1} ({found[2]})" + (f": {inside}" if inside else "")
        return joined(found)


def joined(path: Path) -> str:
    """Keys by points, list entries by their number from 1: `layout.window[2]`."""
    return "".join(f"[{part + 1}]" if isinstance(part, int) else f".{part}" for part in path).removeprefix(".")
