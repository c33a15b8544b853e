"""The layout reader's own process: `python -m flowemu.layout.child PATH`, request on standard input.

The library that reads layout files can be crashed by a damaged file, so it runs here and its end is
judged by the parent (`reading.py`). The request is one JSON object `{"cell", "wanted"}`; the reply
is an 8-byte little-endian length, a JSON object of that length and the loops' vertices as float64.
"""

from __future__ import annotations

import json
import os
import struct
import sys
import warnings
from collections import Counter
from typing import Any, BinaryIO

import numpy as np

from flowemu.layout.contours import merge
from flowemu.layout.hierarchy import check_expansion, check_names, choose_cell

ARC_TOLERANCE = 1e-3
"""Greatest distance in um between a drawn arc and the polygon that stands for it."""
FARTHEST = 1e6
"""Coordinates beyond this many um come from a damaged file."""
MEMORY_LIMIT = 8 << 30
"""Address space of this process in bytes: damaged repetitions ask for any amount."""


def main() -> None:
    """Read the file named on the command line and send the reply to the original standard output."""
    warnings.simplefilter("ignore")
    reply = os.fdopen(os.dup(1), "wb")
    os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
    _limit_memory()
    request = json.loads(sys.stdin.buffer.read())
    vertices: list[np.ndarray] = []
    try:
        header = read(sys.argv[1], request["cell"], request["wanted"], vertices)
    except ValueError as fault:
        header = {"fault": str(fault)}
    except TypeError:  # what the library raises for a name or label that is not text
        header = {"fault": "the file is damaged: a name in it is no text"}
    _send(reply, header, vertices)


def read(path: str, wanted_cell: str | None, wanted: list[list[int]] | None, vertices: list[np.ndarray]) -> dict:
    """The reply's JSON object; the loops' vertices are appended to `vertices` in its order.

    Raises
    ------
    ValueError
        With a text for the user that completes "layout 'x' could not be read: ...".
    """
    library = _library(path)
    check_names([cell.name for cell in library.cells])
    cells = {cell.name: cell for cell in library.cells}
    tops = [cell.name for cell in library.top_level()]
    chosen = choose_cell(cells, tops, wanted_cell)
    header = {"cells": sorted(cells), "top_cells": sorted(tops), "cell": chosen}
    if chosen is not None:
        check_expansion(cells[chosen])
        header |= _contents(cells[chosen], wanted, vertices)
    return header


def _library(path: str) -> Any:
    import gdstk

    with open(path, "rb") as file:
        oasis = file.read(6) == b"%SEMI-"
    try:
        if oasis and gdstk.oas_validate(path)[0] is False:
            raise ValueError("the file is damaged: its checksum is wrong")
        library = (gdstk.read_oas if oasis else gdstk.read_gds)(path, unit=1e-6, tolerance=ARC_TOLERANCE)
    except (OSError, RuntimeError) as fault:
        raise ValueError(f"the file is damaged or cut short ({str(fault).strip('. ').lower()})") from None
    if not 0 < library.precision < 1:
        raise ValueError("the file is damaged: its database unit makes no sense")
    return library


def _contents(cell: Any, wanted: list[list[int]] | None, vertices: list[np.ndarray]) -> dict:
    """Box, layers, labels and merged loops of a cell, flattened."""
    drawn: dict[tuple[int, int], list[np.ndarray]] = {}
    for polygon in cell.get_polygons():
        points = polygon.points
        if not np.all(np.abs(points) <= FARTHEST):
            raise ValueError(f"the file is damaged: it draws farther out than {FARTHEST / 1e6:g} m")
        drawn.setdefault((polygon.layer, polygon.datatype), []).append(points)
    loops = []
    for pair in drawn if wanted is None else [(a, b) for a, b in wanted if (a, b) in drawn]:
        merged = merge(drawn[pair])
        vertices.extend(merged)
        loops.append([*pair, [len(loop) for loop in merged]])
    counts = Counter({pair: len(shapes) for pair, shapes in drawn.items()})
    return {
        "box": _box(drawn),
        "layers": [[*pair, counts[pair]] for pair in sorted(counts)],
        "labels": [[t.layer, t.texttype, t.text, *map(float, t.origin)] for t in cell.get_labels()],
        "loops": loops,
    }


def _box(drawn: dict[tuple[int, int], list[np.ndarray]]) -> list[float] | None:
    shapes = [points for group in drawn.values() for points in group]
    if not shapes:
        return None
    low = np.min([points.min(axis=0) for points in shapes], axis=0)
    high = np.max([points.max(axis=0) for points in shapes], axis=0)
    return [float(v) + 0.0 for v in np.round([*low, *high], 9)]


def _limit_memory() -> None:
    try:
        import resource
    except ImportError:  # not a POSIX system: the parent's time limit has to do
        return
    hard = resource.getrlimit(resource.RLIMIT_AS)[1]
    soft = MEMORY_LIMIT if hard == resource.RLIM_INFINITY else min(MEMORY_LIMIT, hard)
    resource.setrlimit(resource.RLIMIT_AS, (soft, hard))
    resource.setrlimit(resource.RLIMIT_CORE, (0, resource.getrlimit(resource.RLIMIT_CORE)[1]))


def _send(reply: BinaryIO, header: dict, vertices: list[np.ndarray]) -> None:
    text = json.dumps(header).encode()
    reply.write(struct.pack("<Q", len(text)) + text)
    for loop in vertices:
        reply.write(np.ascontiguousarray(loop, dtype="<f8").tobytes())
    reply.close()


if __name__ == "__main__":
    main()
