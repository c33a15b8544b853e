"""Merging drawn polygons into contour loops.

A loop is an `(n, 2)` float64 array in um, not closed by a repeated point, with the drawn area on
its left: outer contours run counter-clockwise, holes clockwise. A list of loops as `merge` returns
it has no overlaps, no shared edges and no bridges to its holes, so every loop edge is a true edge
of the drawn area.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np

PRECISION = 1e-6
"""Vertices are rounded to this many um in boolean operations (coarser on drawings over 1 mm)."""
HEALED_GAP = 1e-3
"""Gaps between slanted edges under this many um come from rounding vertices and are closed."""

Loops = list[np.ndarray]
Point = tuple[int, int]


def merge(polygons: Iterable[Any]) -> Loops:
    """Union of polygons as contour loops.

    Parameters
    ----------
    polygons : iterable of (n, 2) array_like, um, or of gdstk polygons
        Any winding, overlapping or touching; shapes without area are dropped.

    Returns
    -------
    list of (n, 2) float64, um
        Vertices within 2e-6 um of the drawn ones, or 2e-9 of the drawing's extent if that is more.
    """
    import gdstk

    shapes = [points for points in map(_points, polygons) if len(points) >= 3]
    if not shapes:
        return []
    step = precision_for(shapes)
    united = gdstk.boolean(shapes, [], "or", precision=step)
    if not all(_axis_parallel(points) for points in shapes):
        half = 0.6 * HEALED_GAP
        united = gdstk.offset(united, half, "miter", 20, step, True)
        united = gdstk.offset(united, -half, "miter", 20, step, True)
    return outlines([polygon.points for polygon in united], step)


def precision_for(shapes: Sequence[np.ndarray]) -> float:
    """Rounding step in um that keeps the integer arithmetic of `outlines` exact."""
    corners = np.concatenate([np.stack([points.min(axis=0), points.max(axis=0)]) for points in shapes])
    return max(PRECISION, float(np.ptp(corners, axis=0).max()) * 1e-9)


def signed_area(loop: np.ndarray) -> float:
    """Area of a loop in um^2: positive for an outer contour, negative for a hole."""
    x, y = (loop - loop[0]).T
    return 0.5 * float(np.dot(x, np.roll(y, -1)) - np.dot(y, np.roll(x, -1)))


def segments_of(loops: Sequence[np.ndarray]) -> np.ndarray:
    """All edges of the loops as `(m, 4)` float64 rows (x1, y1, x2, y2), um."""
    rows = [np.hstack([loop, np.roll(loop, -1, axis=0)]) for loop in loops]
    return np.concatenate(rows) if rows else np.empty((0, 4))


def as_polygons(loops: Sequence[np.ndarray], step: float) -> list[Any]:
    """Loops as gdstk polygons with bridged holes, the form that gdstk's own operations take.

    Larger loops go first: a hole is smaller than what it is cut from, an island smaller than the
    hole around it, so adding and cutting in falling order of area gives the right solid.
    """
    import gdstk

    region: list[Any] = []
    ranked = sorted(((signed_area(loop), loop) for loop in loops), key=lambda pair: -abs(pair[0]))
    start = 0
    while start < len(ranked):
        drawn = ranked[start][0] > 0
        stop = start
        while stop < len(ranked) and (ranked[stop][0] > 0) == drawn:
            stop += 1
        run = [loop for _, loop in ranked[start:stop]]
        region = gdstk.boolean(region, run, "or" if drawn else "not", precision=step)
        start = stop
    return region


def outlines(polygons: Sequence[np.ndarray], step: float) -> Loops:
    """True contours of disjoint polygons whose holes are joined to them by bridges.

    Edges that run back over one another (bridges, edges shared by neighbours) cancel exactly on the
    integer raster of `step` um; what is left is chained into loops.
    """
    shapes = [np.asarray(points, dtype=float) for points in polygons if len(points) >= 3]
    if not shapes:
        return []
    centre = np.round(np.mean([points.mean(axis=0) for points in shapes], axis=0) / step) * step
    raster = [np.rint((points - centre) / step).astype(np.int64) for points in shapes]
    edges = np.concatenate([np.hstack([p, np.roll(p, -1, axis=0)]) for p in raster])
    edges = edges[np.any(edges[:, :2] != edges[:, 2:], axis=1)]
    return [centre + step * loop for loop in _tidy(_chain(_cancel(edges)))]


def _points(polygon: Any) -> np.ndarray:
    return np.asarray(getattr(polygon, "points", polygon), dtype=float).reshape(-1, 2)


def _axis_parallel(points: np.ndarray) -> bool:
    step = np.abs(np.roll(points, -1, axis=0) - points)
    return bool(np.all(step.min(axis=1) == 0.0))


def _cancel(edges: np.ndarray) -> np.ndarray:
    """Edges `(m, 4)` int64 with opposed overlapping stretches taken out."""
    line, forward = _lines(edges)
    ahead, all_on = np.bincount(line, weights=forward), np.bincount(line)
    mixed = ((ahead > 0) & (ahead < all_on))[line]
    if not mixed.any():
        return edges
    return np.concatenate([edges[~mixed], _net_stretches(edges[mixed], line[mixed])])


def _lines(edges: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """For each edge the number of the straight line it lies on, and whether it runs along it in rising x (or y)."""
    run = edges[:, 2:] - edges[:, :2]
    unit = run // np.gcd(np.abs(run[:, 0]), np.abs(run[:, 1]))[:, None]
    forward = (unit[:, 0] > 0) | ((unit[:, 0] == 0) & (unit[:, 1] > 0))
    unit = np.where(forward[:, None], unit, -unit)
    key = np.column_stack([unit, unit[:, 0] * edges[:, 1] - unit[:, 1] * edges[:, 0]])
    order, first = _groups(key)
    line = np.empty(len(edges), dtype=np.int64)
    line[order] = np.cumsum(first) - 1
    return line, forward


def _groups(rows: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The order that sorts int rows `(m, k)` by their columns, and which of the sorted ones differ from the last."""
    order = np.lexsort(rows.T[::-1])
    ranked = rows[order]
    first = np.ones(len(rows), dtype=bool)
    first[1:] = np.any(ranked[1:] != ranked[:-1], axis=1)
    return order, first


def _net_stretches(edges: np.ndarray, line: np.ndarray) -> np.ndarray:
    """Stretches `(k, 4)` of straight lines that more edges run along one way than the other."""
    ends = np.concatenate([edges[:, :2], edges[:, 2:]])
    order, first = _groups(np.column_stack([np.tile(line, 2), ends]))
    place = np.cumsum(first) - 1
    net = np.zeros(place[-1] + 1, dtype=np.int64)
    # +1 at an edge's start and -1 at its end: summed along a line, the edges that run forward less those back.
    np.add.at(net, place, np.where(order < len(edges), 1, -1))
    net = np.cumsum(net)[:-1]
    places = ends[order][first]
    low, high = places[:-1], places[1:]
    along = np.where((net > 0)[:, None], np.hstack([low, high]), np.hstack([high, low]))
    return along[net != 0]


def _chain(edges: np.ndarray) -> Loops:
    """Closed loops of int64 points; where several edges leave a point, the leftmost turn is taken."""
    leaving: dict[Point, list[Point]] = defaultdict(list)
    for x1, y1, x2, y2 in edges.tolist():
        leaving[(x1, y1)].append((x2, y2))
    loops = []
    for first in list(leaving):
        while leaving[first]:
            loops.append(np.array(_walk(first, leaving), dtype=np.int64))
    return loops


def _walk(first: Point, leaving: dict[Point, list[Point]]) -> list[Point]:
    """One loop from `first` back to it; as many edges reach each point as leave it, so it closes."""
    loop, here, there = [first], first, leaving[first].pop()
    while there != first:
        loop.append(there)
        ways = leaving[there]
        turn = max(range(len(ways)), key=lambda k: _turn(here, there, ways[k])) if len(ways) > 1 else 0
        here, there = there, ways.pop(turn)
    return loop


def _turn(before: Point, here: Point, after: Point) -> float:
    """Angle in rad by which the path turns at `here`, left positive."""
    ax, ay = here[0] - before[0], here[1] - before[1]
    bx, by = after[0] - here[0], after[1] - here[1]
    return float(np.arctan2(float(ax * by - ay * bx), float(ax * bx + ay * by)))


def _tidy(loops: Loops) -> Loops:
    """Loops of int64 points without points on straight edges; loops a few raster steps thin are left out."""
    if not loops:
        return []
    points, lengths = np.concatenate(loops), np.array([len(loop) for loop in loops])
    stops = np.cumsum(lengths)
    starts = stops - lengths
    after = np.arange(1, len(points) + 1)
    after[stops - 1] = starts
    out = points[after] - points
    into = np.empty_like(out)
    into[after] = out
    corner = into[:, 0] * out[:, 1] != into[:, 1] * out[:, 0]
    x, y = (points - np.repeat(points[starts], lengths, axis=0)).T.astype(float)
    area = 0.5 * np.add.reduceat(x * y[after] - x[after] * y, starts)
    perimeter = np.add.reduceat(np.hypot(*out.T.astype(float)), starts)
    solid = np.flatnonzero(np.abs(area) > 4 * perimeter)
    return [points[starts[k] : stops[k]][corner[starts[k] : stops[k]]] for k in solid]
