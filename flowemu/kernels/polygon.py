"""Signed distance in the plane from the samples of a raster to the edges of polygons."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

BLOCK = 64
"""Samples along a side of the blocks that are worked in parallel."""
TILE = 8
"""Samples along a side of the tiles that share one short list of edges."""


def signed_distance(segments: np.ndarray, x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Exact distance to the nearest edge, negative where the edges wind about the sample.

    Parameters
    ----------
    segments : (m, 4) float64, m > 0
        Edges (x1, y1, x2, y2) of closed loops, in any order.
    x, y : (nx,), (ny,) float64
        Rising sample places.

    Returns
    -------
    (ny, nx) float32
        In the unit of the coordinates; error that of float32.

    Notes
    -----
    An edge can be nearest to a sample of a tile only if its distance from the tile's centre is
    within twice the tile's radius of the least such distance, which leaves a few edges a tile.
    """
    distance = np.empty((len(y), len(x)), dtype=np.float32)
    _fill_distance(segments, x, y, distance)
    _set_sign(segments, x, y, distance)
    return distance


@njit(cache=True)
def _squared(segments: np.ndarray, k: int, px: float, py: float) -> float:
    """Squared distance from a point to edge k."""
    ax, ay = segments[k, 0], segments[k, 1]
    dx, dy = segments[k, 2] - ax, segments[k, 3] - ay
    length = dx * dx + dy * dy
    share = 0.0
    if length > 0.0:
        share = min(1.0, max(0.0, ((px - ax) * dx + (py - ay) * dy) / length))
    ex, ey = px - ax - share * dx, py - ay - share * dy
    return ex * ex + ey * ey


@njit(cache=True)
def _shortlist(
    segments: np.ndarray, listed: np.ndarray, count: int, x0: float, x1: float, y0: float, y1: float, out: np.ndarray
) -> int:
    """Edges of `listed[:count]` that can be nearest somewhere in a rectangle; returns how many."""
    px, py = 0.5 * (x0 + x1), 0.5 * (y0 + y1)
    radius = 0.5 * np.hypot(x1 - x0, y1 - y0)
    least = np.inf
    for i in range(count):
        least = min(least, _squared(segments, listed[i], px, py))
    bound = (np.sqrt(least) + 2.0 * radius) * (1.0 + 1e-12)
    kept = 0
    for i in range(count):
        if _squared(segments, listed[i], px, py) <= bound * bound:
            out[kept] = listed[i]
            kept += 1
    return kept


@njit(cache=True)
def _fill_tile(
    segments: np.ndarray,
    listed: np.ndarray,
    count: int,
    x: np.ndarray,
    y: np.ndarray,
    distance: np.ndarray,
    ix: int,
    iy: int,
) -> None:
    """Distances of the tile that begins at (iy, ix)."""
    for j in range(iy, min(iy + TILE, len(y))):
        for i in range(ix, min(ix + TILE, len(x))):
            least = np.inf
            for k in range(count):
                least = min(least, _squared(segments, listed[k], x[i], y[j]))
            distance[j, i] = np.sqrt(least)


@njit(cache=True)
def _fill_block(
    segments: np.ndarray, every: np.ndarray, x: np.ndarray, y: np.ndarray, distance: np.ndarray, ix: int, iy: int
) -> None:
    """Distances of the block that begins at (iy, ix), tile by tile."""
    jx, jy = min(ix + BLOCK, len(x)), min(iy + BLOCK, len(y))
    near = np.empty(len(segments), dtype=np.int64)
    nearer = np.empty(len(segments), dtype=np.int64)
    count = _shortlist(segments, every, len(segments), x[ix], x[jx - 1], y[iy], y[jy - 1], near)
    for ty in range(iy, jy, TILE):
        for tx in range(ix, jx, TILE):
            ex, ey = min(tx + TILE, jx), min(ty + TILE, jy)
            kept = _shortlist(segments, near, count, x[tx], x[ex - 1], y[ty], y[ey - 1], nearer)
            _fill_tile(segments, nearer, kept, x, y, distance, tx, ty)


@njit(parallel=True, cache=True)
def _fill_distance(segments: np.ndarray, x: np.ndarray, y: np.ndarray, distance: np.ndarray) -> None:
    across = (len(x) + BLOCK - 1) // BLOCK
    down = (len(y) + BLOCK - 1) // BLOCK
    every = np.arange(len(segments))
    for block in prange(across * down):
        _fill_block(segments, every, x, y, distance, (block % across) * BLOCK, (block // across) * BLOCK)


@njit(cache=True)
def _windings(segments: np.ndarray, x: np.ndarray, py: float, turns: np.ndarray) -> None:
    """Changes of the winding number along the row at `py`, each at the first sample behind it."""
    turns[:] = 0
    for k in range(len(segments)):
        y1, y2 = segments[k, 1], segments[k, 3]
        if (y1 <= py) != (y2 <= py):
            share = (py - y1) / (y2 - y1)
            place = segments[k, 0] + share * (segments[k, 2] - segments[k, 0])
            turns[np.searchsorted(x, place)] += 1 if y2 > y1 else -1


@njit(parallel=True, cache=True)
def _set_sign(segments: np.ndarray, x: np.ndarray, y: np.ndarray, distance: np.ndarray) -> None:
    for j in prange(len(y)):
        turns = np.zeros(len(x) + 1, dtype=np.int64)
        _windings(segments, x, y[j], turns)
        winding = 0
        for i in range(len(x)):
            winding += turns[i]
            if winding != 0:
                distance[j, i] = -distance[j, i]
