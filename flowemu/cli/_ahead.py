"""Starts reading the layout while the flow is still being checked: the reader is a process of its own."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from contextlib import contextmanager
from pathlib import Path
from typing import Any


@contextmanager
def layout_ahead(data: dict[str, Any], flow_file: Path, allow: Iterable[str]) -> Iterator[Callable[..., Any]]:
    """A `read_layout` that has begun already for the layout that the unchecked `data` of a flow name.

    Only its facts are read, no polygons.
    """
    asked = _asked(data, flow_file, allow)
    with ThreadPoolExecutor(1) as pool:
        begun: Future[Any] | None = pool.submit(_read, *asked) if asked else None

        def read(path: Path, cell: str | None, wanted: Iterable[Any]) -> Any:
            return begun.result() if begun and asked == (path, cell) else _read(path, cell)

        yield read


def _read(path: Path, cell: str | None) -> Any:
    from flowemu.layout import read_layout

    return read_layout(path, cell, ())


def _asked(data: dict[str, Any], flow_file: Path, allow: Iterable[str]) -> tuple[Path, str | None] | None:
    """The layout file and cell, as far as they can be told; None where the flow is wrong about them."""
    from flowemu.flow.paths import named_file

    layout = data.get("layout")
    if not isinstance(layout, dict) or not isinstance(layout.get("file"), str):
        return None
    cell = layout.get("cell")
    try:
        path = named_file(flow_file, layout["file"], [Path(folder) for folder in allow])
    except (OSError, ValueError):
        return None
    return (path, cell) if cell is None or isinstance(cell, str) else None
