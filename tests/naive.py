"""Slow, plain twins of the kernels, written for clarity and compared with them on small input."""

from __future__ import annotations

import heapq
import math

import numpy as np


def grid_neighbours(shape: tuple[int, int, int]) -> np.ndarray:
    """Neighbour table of a grid, `(n, 6)` int32, -1 for none."""
    ids = np.full([n + 2 for n in shape], -1)
    ids[1:-1, 1:-1, 1:-1] = np.arange(math.prod(shape)).reshape(shape)
    rolled = [np.roll(ids, -step, axis) for axis in (2, 1, 0) for step in (-1, 1)]
    return np.stack([r[1:-1, 1:-1, 1:-1].ravel() for r in rolled], axis=1).astype(np.int32)


def front_passes(feet: list[tuple[float, float]], slowness: float) -> float:
    """The t that solves `sum of weight x max(0, t - foot)^2 = slowness^2`, by bisection.

    `feet` holds (foot, weight) pairs.
    """
    low = min(foot for foot, _ in feet)
    high = min(foot + slowness / math.sqrt(weight) for foot, weight in feet)
    for _ in range(80):
        t = 0.5 * (low + high)
        reached = sum(weight * max(0.0, t - foot) ** 2 for foot, weight in feet)
        low, high = (t, high) if reached < slowness**2 else (low, t)
    return high


def one_sided(t1: float, t2: float | None, a: float, b: float) -> tuple[float, float]:
    """(foot, weight) of the second-order derivative at graded spacings; of the first where t2 is no use (None)."""
    if t2 is None or t2 > t1:
        return t1, a**-2.0
    slope = (2 * a + b) / (a * (a + b))
    return ((a + b) / (a * b) * t1 - a / (b * (a + b)) * t2) / slope, slope**2


def arrival_by_heap(
    start: np.ndarray,
    slowness: np.ndarray,
    nbr: np.ndarray,
    place: np.ndarray,
    limit: float = np.inf,
) -> np.ndarray:
    """Marching in strict order of time, `(n,)`; the twin of `arrival_on_graph` and of `arrival_on_grid`.

    Parameters
    ----------
    start, slowness : (n,)
    nbr : (n, 6) int
    place : (n, 3) x, y, z of each node
    """
    time = np.asarray(start, np.float64).copy()
    final = np.zeros(len(time), bool)
    heap = [(t, i) for i, t in enumerate(time) if t < np.inf]
    heapq.heapify(heap)
    while heap:
        t, i = heapq.heappop(heap)
        if final[i] or t > limit:
            continue
        final[i] = True
        for j in nbr[i]:
            if j >= 0 and not final[j] and np.isfinite(slowness[j]):
                new = _time_at(time, final, slowness, nbr, place, j, i)
                if new < time[j]:
                    time[j] = new
                    heapq.heappush(heap, (new, j))
    return np.where(final, time, np.inf)


def _time_at(
    time: np.ndarray, final: np.ndarray, slowness: np.ndarray, nbr: np.ndarray, place: np.ndarray, i: int, via: int
) -> float:
    """Time of a node from its final neighbours: each axis takes the side from which it would be reached first.

    Where no axis has a second-order slope of half the slowness or more, the straight way counts too, from the
    neighbours of the node `via` across the axis that leads from it to node i.
    """
    feet, steep_axes = [], 0
    for axis in range(3):
        sides = []
        for d in (2 * axis, 2 * axis + 1):
            j = nbr[i, d]
            if j < 0 or not final[j]:
                continue
            jj = nbr[j, d]
            a = abs(place[j, axis] - place[i, axis])
            smooth = jj >= 0 and final[jj] and time[jj] <= time[j] and _alike(slowness, i, j, jj)
            b = abs(place[jj, axis] - place[j, axis]) if smooth else a
            steep = smooth and time[j] - time[jj] > 0.5 * slowness[i] * a
            sides.append((time[j] + slowness[i] * a, steep, one_sided(time[j], time[jj] if smooth else None, a, b)))
        if sides:
            first = min(sides)
            feet.append(first[2])
            steep_axes += first[1]
    new = front_passes(feet, slowness[i])
    if steep_axes:
        return new
    along = int(np.argmax(np.abs(place[i] - place[via])))
    across = [m for e, m in enumerate(nbr[via]) if e // 2 != along and m >= 0 and final[m]]
    ways = [time[m] + slowness[i] * math.dist(place[m], place[i]) for m in across if _alike(slowness, i, via, m)]
    return min([new, *ways])


def _alike(slowness: np.ndarray, i: int, *others: int) -> bool:
    """Whether the other nodes are of node i's slowness or fixed sources."""
    return all(np.isinf(slowness[j]) or abs(slowness[j] / slowness[i] - 1) <= 0.1 for j in others)


def distance_to_points(points: np.ndarray, places: np.ndarray) -> np.ndarray:
    """Distance of each place `(n, 3)` to the nearest of the points `(m, 3)`, all pairs tried."""
    return np.array([np.sqrt(((points - p) ** 2).sum(axis=1)).min() for p in places])


def straddling(field: np.ndarray) -> np.ndarray:
    """Samples with one of the six neighbours on the other side of zero; zero counts as outside."""
    inside = field < 0
    found = np.zeros(field.shape, bool)
    for k, j, i in np.ndindex(field.shape):
        for step in ((1, 0, 0), (-1, 0, 0), (0, 1, 0), (0, -1, 0), (0, 0, 1), (0, 0, -1)):
            other = (k + step[0], j + step[1], i + step[2])
            if all(0 <= o < n for o, n in zip(other, field.shape, strict=True)):
                found[k, j, i] |= inside[other] != inside[k, j, i]
    return found
