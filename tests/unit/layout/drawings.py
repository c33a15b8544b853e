"""Small layout files and shapes for the layout tests."""

from __future__ import annotations

import struct
from pathlib import Path

import gdstk
import numpy as np

FORMATS = ("gds", "oas")


def square(x0: float, y0: float, x1: float, y1: float) -> np.ndarray:
    """A rectangle as `(4, 2)` corners."""
    return np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]], dtype=float)


def circle(x: float, y: float, radius: float, sides: int) -> np.ndarray:
    """A regular polygon as `(sides, 2)` corners, the first one to the right."""
    angle = np.arange(sides) * 2 * np.pi / sides
    return np.column_stack([x + radius * np.cos(angle), y + radius * np.sin(angle)])


def turned(points: np.ndarray, angle: float) -> np.ndarray:
    """Points turned about the origin, rad."""
    c, s = np.cos(angle), np.sin(angle)
    return points @ np.array([[c, s], [-s, c]])


def save(library: gdstk.Library, folder: Path, ending: str, name: str = "die") -> Path:
    """Write a library as GDSII or OASIS by its ending."""
    path = folder / f"{name}.{ending}"
    if ending == "gds":
        library.write_gds(path)
    else:
        library.write_oas(path)
    return path


def rich_library(unit: float = 1e-6, precision: float = 1e-9) -> gdstk.Library:
    """A plate with a path and a label, placed turned, mirrored, magnified and in an array."""
    library = gdstk.Library(unit=unit, precision=precision)
    plate, top = library.new_cell("plate"), library.new_cell("top")
    plate.add(gdstk.rectangle((0, 0), (10, 5), layer=3, datatype=1))
    plate.add(gdstk.FlexPath([(0, 8), (20, 8)], 2, layer=4, simple_path=True))
    plate.add(gdstk.Label("plate", (1, 2), layer=60, texttype=2))
    top.add(gdstk.Reference(plate, (0, 0)))
    top.add(gdstk.Reference(plate, (100, 0), rotation=np.pi / 2, magnification=2, x_reflection=True))
    top.add(gdstk.Reference(plate, (0, 100), columns=3, rows=2, spacing=(30, 40)))
    return library


def record(kind: int, data_type: int, payload: bytes = b"") -> bytes:
    """One GDSII record."""
    return struct.pack(">HBB", 4 + len(payload), kind, data_type) + payload


def gdsii(*cells: tuple[str, bytes]) -> bytes:
    """A GDSII stream of 1 nm database units made of raw cell bodies."""
    dates = struct.pack(">12h", *[1970, 1, 1, 0, 0, 0] * 2)
    units = bytes.fromhex("3e4189374bc6a7f03944b82fa09b5a54")
    parts = [record(0, 2, struct.pack(">h", 600)), record(1, 2, dates), record(2, 6, b"LIB\0"), record(3, 5, units)]
    for name, body in cells:
        parts += [record(5, 2, dates), record(6, 6, _even(name)), body, record(7, 0)]
    return b"".join([*parts, record(4, 0)])


def placed(name: str) -> bytes:
    """A reference to a cell, in a GDSII cell body."""
    at = record(0x10, 3, struct.pack(">2i", 5, 5))
    return record(0x0A, 0) + record(0x12, 6, _even(name)) + at + record(0x11, 0)


def boxed(layer: int, kind: int, width: int, height: int) -> bytes:
    """A BOX element, in a GDSII cell body; sizes in database units."""
    corners = struct.pack(">10i", 0, 0, width, 0, width, height, 0, height, 0, 0)
    head = record(0x0D, 2, struct.pack(">h", layer)) + record(0x2E, 2, struct.pack(">h", kind))
    return record(0x2D, 0) + head + record(0x10, 3, corners) + record(0x11, 0)


def _even(name: str) -> bytes:
    return name.encode() + b"\0" * (len(name) % 2)
