"""A small released bridge from analytic fields: thin films, a free plate over a gap, an anchor."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.stack import FilmStack

CELL = 0.5


def rectangle(grid: Grid, x0: float, y0: float, x1: float, y1: float) -> np.ndarray:
    """Signed planar distance to a rectangle, negative inside, `(1, ny, nx)` um."""
    dx = np.maximum(x0 - grid.x, grid.x - x1)[None, None, :]
    dy = np.maximum(y0 - grid.y, grid.y - y1)[None, :, None]
    return np.hypot(np.maximum(dx, 0), np.maximum(dy, 0)) + np.minimum(np.maximum(dx, dy), 0)


def standing(top: np.ndarray, side: np.ndarray) -> np.ndarray:
    """Distance to a block under `top` and within `side`, exact outside."""
    return np.hypot(np.maximum(top, 0), np.maximum(side, 0)) + np.minimum(np.maximum(top, side), 0)


def bridge(cell: float = CELL) -> FilmStack:
    """A wafer with a pit, a nitride of 0.1 cell, a ground plane, glass left at one side, an anchored plate."""
    grid = Grid(-30.0, -15.0, cell, round(60 / cell), round(30 / cell), np.arange(-6.0, 11.0 + cell / 2, cell))
    z = grid.z[:, None, None] + 0.07 * cell
    slope = np.radians(54.7)
    pit = (z / np.tan(slope) - rectangle(grid, 12, -8, 24, 8)) * np.sin(slope)
    pad, hole, plate, mirror = (
        rectangle(grid, *corners) for corners in ((-22, -9, 6, 9), (-18, -4, -12, 4), (-24, -10, 9, 10), (-5, -6, 5, 6))
    )
    wafer = np.maximum(z, np.minimum(pit, z + 3.5))
    nitride = wafer - 0.1 * cell
    with_pad = np.minimum(nitride, standing(nitride - 0.4, pad))
    glass = with_pad - 2.0
    opened = np.minimum(with_pad, np.maximum(glass, -hole))
    poly = opened - 2.0
    released = np.maximum(-hole, rectangle(grid, -30, -15, -20.5, 15))

    def on_grid(field: np.ndarray) -> np.ndarray:
        return np.ascontiguousarray(np.broadcast_to(field, grid.shape), dtype=np.float32)

    rows = [
        ("wafer", "silicon", None, 0, z, None, wafer),
        ("isolation", "low-stress nitride", None, 1, nitride, wafer, None),
        ("ground", "polysilicon", "n+", 2, nitride - 0.4, nitride, pad),
        ("glass", "psg", "annealed", 5, glass, with_pad, released),
        ("poly", "polysilicon", "n+", 9, poly, opened, plate),
        ("mirror", "gold", None, 12, poly - 0.1 * cell, poly, mirror),
    ]
    films = tuple(
        Film(*head, *(None if field is None else on_grid(field) for field in fields))
        for *head, top, floor, gone in rows
        for fields in [(top, floor, gone)]
    )
    return FilmStack(grid, films, films[-1].top)


@pytest.fixture(scope="session")
def bridge_stack() -> FilmStack:
    """The bridge, once for all pictures."""
    return bridge()


@pytest.fixture(scope="session")
def bridge_masks() -> dict[str, list[np.ndarray]]:
    """Mask polygons `(n, 2)` um that would draw the bridge."""

    def box(x0: float, y0: float, x1: float, y1: float) -> np.ndarray:
        return np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]], dtype=float)

    return {
        "GROUND": [box(-22, -9, 6, 9)],
        "ANCHOR": [box(-18, -4, -12, 4)],
        "PLATE": [box(-24, -10, 9, 10)],
        "MIRROR": [box(-5, -6, 5, 6)],
        "PIT": [box(12, -8, 24, 8)],
    }
