"""The cell tree of a layout: what it refers to, how far it expands, and what forbids reading it.

Runs in the reader's own process and works on gdstk objects. Every function raises `ValueError`
with a text for the user.
"""

from __future__ import annotations

from typing import Any

MAX_POLYGONS = 2_000_000
"""Polygons that a cell may expand to; a drawing of one die is far below this."""
MAX_DEPTH = 400
"""Levels of cells below the chosen one; deeper trees overflow the reader's stack."""


def choose_cell(cells: dict[str, Any], tops: list[str], wanted: str | None) -> str | None:
    """The cell to read: the one asked for, or the only top cell; None where there is no such one."""
    if not cells:
        raise ValueError("it has no cells")
    if not tops:
        expanded_polygons(next(iter(cells.values())))
    if wanted is not None:
        return wanted if wanted in cells else None
    return tops[0] if len(tops) == 1 else None


def check_names(names: list[str]) -> None:
    """Refuse a file in which two cells have one name."""
    seen: set[str] = set()
    for name in names:
        if name in seen:
            raise ValueError(f"two of its cells are called '{name}'")
        seen.add(name)


def expanded_polygons(top: Any) -> int:
    """Number of polygons that a cell expands to, counted without expanding it."""
    counts: dict[str, int] = {}
    path: list[str] = []
    todo: list[tuple[Any, bool]] = [(top, False)]
    while todo:
        cell, done = todo.pop()
        if done:
            path.pop()
            counts[cell.name] = _own(cell) + sum(times * counts[child.name] for child, times in _children(cell))
        elif cell.name in path:
            circle = [*path[path.index(cell.name) :], cell.name]
            raise ValueError(f"its cells refer to one another in a circle: {' > '.join(circle)}")
        elif cell.name not in counts:
            path.append(cell.name)
            _check_depth(path)
            todo.append((cell, True))
            todo.extend((child, False) for child, _ in _children(cell))
    return counts[top.name]


def check_expansion(top: Any) -> None:
    """Refuse circles, missing cells, and cells that expand beyond `MAX_POLYGONS`."""
    count = expanded_polygons(top)
    if count > MAX_POLYGONS:
        raise ValueError(f"cell '{top.name}' expands to {count:,} polygons; the limit is {MAX_POLYGONS:,}")


def _check_depth(path: list[str]) -> None:
    if len(path) > MAX_DEPTH:
        raise ValueError(f"its cells are nested more than {MAX_DEPTH} deep below '{path[0]}'")


def _children(cell: Any) -> list[tuple[Any, int]]:
    pairs = []
    for reference in cell.references:
        if not hasattr(reference.cell, "references"):
            name = getattr(reference.cell, "name", reference.cell)
            raise ValueError(f"cell '{cell.name}' refers to cell '{name}', which is not in the file")
        pairs.append((reference.cell, _times(reference)))
    return pairs


def _own(cell: Any) -> int:
    shapes = sum(_times(polygon) for polygon in cell.polygons) + sum(_times(label) for label in cell.labels)
    return shapes + sum(_times(path) * path.num_paths for path in cell.paths)


def _times(element: Any) -> int:
    """How often an element's own repetition draws it."""
    return max(1, int(element.repetition.size))
