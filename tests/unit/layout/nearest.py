"""How far a place, or a region, is from the nearest drawn shape."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from flowemu.layout.contours import segments_of

CHUNK = 1 << 20
"""Point-to-edge pairs that are held in memory at a time."""


def nearest(loops: Sequence[np.ndarray], target: np.ndarray) -> tuple[float, tuple[float, float] | None]:
    """Distance from a point or a region to the drawn area, and the drawn place that is nearest.

    Parameters
    ----------
    loops : sequence of (n, 2) float64, um
        Merged contours.
    target : (2,) or (n, 2) array_like, um
        A point, or one polygon.

    Returns
    -------
    distance : float, um
        0 where they overlap; infinite where nothing is drawn.
    place : (x, y) or None, um
        The nearest point of the drawn area, or a shared one.
    """
    edges = segments_of(loops)
    if not len(edges):
        return np.inf, None
    corners = np.atleast_2d(np.asarray(target, dtype=float))
    shared = _shared(edges, corners)
    if shared is not None:
        return 0.0, shared
    distance, _, place = _closest(corners, edges)
    if len(corners) > 1:
        back, corner, _ = _closest(edges[:, :2], segments_of([corners]))
        if back < distance:
            distance, place = back, corner
    return distance, (float(place[0]), float(place[1]))


def contains(edges: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Which of `(n, 2)` points lie inside the area bounded by `(m, 4)` edges; `(n,)` bool."""
    x1, y1, x2, y2 = edges.T
    inside = np.zeros(len(points), dtype=bool)
    for start, stop in _chunks(len(points), len(edges)):
        x, y = points[start:stop, 0, None], points[start:stop, 1, None]
        crossing = (y1 <= y) != (y2 <= y)
        with np.errstate(divide="ignore", invalid="ignore"):
            right = x1 + (y - y1) * (x2 - x1) / (y2 - y1) > x
        inside[start:stop] = np.count_nonzero(crossing & right, axis=1) % 2 == 1
    return inside


def _shared(edges: np.ndarray, corners: np.ndarray) -> tuple[float, float] | None:
    """A point of both areas, or None."""
    within = contains(edges, corners)
    if within.any():
        x, y = corners[within][0]
        return float(x), float(y)
    if len(corners) == 1:
        return None
    sides = segments_of([corners])
    covered = contains(sides, edges[:, :2])
    if covered.any():
        x, y = edges[covered][0, :2]
        return float(x), float(y)
    return _crossing(edges, sides)


def _crossing(edges: np.ndarray, sides: np.ndarray) -> tuple[float, float] | None:
    """The first place where an edge `(m, 4)` and a side `(n, 4)` cross."""
    for x1, y1, x2, y2 in sides:
        run, side = edges[:, 2:] - edges[:, :2], np.array([x2 - x1, y2 - y1])
        gap = np.array([x1, y1]) - edges[:, :2]
        area = run[:, 0] * side[1] - run[:, 1] * side[0]
        with np.errstate(divide="ignore", invalid="ignore"):
            t = (gap[:, 0] * side[1] - gap[:, 1] * side[0]) / area
            s = (gap[:, 0] * run[:, 1] - gap[:, 1] * run[:, 0]) / area
        hit = (t >= 0) & (t <= 1) & (s >= 0) & (s <= 1)
        if hit.any():
            k = int(np.argmax(hit))
            x, y = edges[k, :2] + t[k] * run[k]
            return float(x), float(y)
    return None


def _closest(points: np.ndarray, edges: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
    """Least distance between points `(n, 2)` and edges `(m, 4)`; that point, and its foot on the edge."""
    best, which, place = np.inf, points[0], points[0]
    start_at, run = edges[:, :2], edges[:, 2:] - edges[:, :2]
    for start, stop in _chunks(len(points), len(edges)):
        from_start = points[start:stop, None, :] - start_at
        share = np.clip((from_start * run).sum(axis=2) / (run * run).sum(axis=1), 0.0, 1.0)
        reach = np.linalg.norm(from_start - share[:, :, None] * run, axis=2)
        i, k = np.unravel_index(int(np.argmin(reach)), reach.shape)
        if reach[i, k] < best:
            best, which = float(reach[i, k]), points[start + i]
            place = start_at[k] + share[i, k] * run[k]
    return best, which, place


def _chunks(points: int, edges: int) -> list[tuple[int, int]]:
    size = max(1, CHUNK // max(1, edges))
    return [(start, min(points, start + size)) for start in range(0, points, size)]
