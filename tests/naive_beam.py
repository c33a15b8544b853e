"""Slow, plain twins of the kernels of a vertical beam, and small random stacks to try them on.

A `Column` is what one column of samples holds, seen upward: (code, from, to, node) of every interval
along its edges, heights in um; node numbers the piece's sample or interval (see `kernels.regions`).
"""

from __future__ import annotations

from itertools import pairwise
from types import SimpleNamespace

import numpy as np
from scipy.ndimage import gaussian_filter

from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.topology import Topology

Column = list[tuple[int, float, float, int]]


def random_stack(seed: int, films: int = 4) -> tuple[Grid, Topology]:
    """Films of random waves over a wafer on 8 graded planes of 5 x 6 samples, with holes in some."""
    rng = np.random.default_rng(seed)
    grid = Grid(0.0, 0.0, 1.0, 6, 5, np.cumsum(rng.uniform(0.8, 1.2, 9)) - 3.0)
    height = grid.z[:, None, None]

    def waves(sigma: float) -> np.ndarray:
        return gaussian_filter(rng.normal(size=grid.shape), sigma) * (2 * sigma) ** 1.5

    top = (height + 0.7 * waves(1.0)).astype(np.float32)
    stack = [Film("wafer", "silicon", None, 0, top)]
    for k in range(1, films):
        floor, top = top, np.minimum(top, height - 1.1 * k + waves(0.8)).astype(np.float32)
        gone = waves(0.9).astype(np.float32) - np.float32(0.3) if k % 2 else None
        stack.append(Film(f"film{k}", "x", None, k, top, floor, gone))
    return grid, Topology.of(grid, stack)


def scattered(seed: int) -> SimpleNamespace:
    """What the kernels of a beam read of a topology: films strewn over 10 planes of 4 x 5 samples, no edge cut."""
    rng = np.random.default_rng(seed)
    code = rng.integers(-1, 4, (10, 4, 5)).astype(np.int16)
    return SimpleNamespace(
        code=code, row_of=np.full(code.size, -1, np.int32), count=np.zeros((1, 7), np.uint8),
        start=np.zeros(8, np.int64), interval_code=np.zeros(1, np.int16), interval_end=np.ones(1, np.float32),
        strides=np.array([1, 5, 20]), grid=SimpleNamespace(z=np.cumsum(rng.uniform(0.2, 0.6, 10))),
    )  # fmt: skip


def edge_intervals(t: Topology, i: int, d: int) -> list[tuple[int, float, float]]:
    """(code, low, high) along the edge that leaves sample i in direction d, shares of the edge."""
    s = t.row_of[i]
    n = int(t.count[s, d]) if s >= 0 else 0
    if n == 0:
        return [(int(t.code.reshape(-1)[i]), 0.0, 1.0)]
    at = int(t.start[s * 7 + d])
    ends = [0.0, *(float(e) for e in t.interval_end[at : at + n])]
    return [(int(t.interval_code[at + q]), ends[q], ends[q + 1]) for q in range(n)]


def edge_nodes(t: Topology, i: int, d: int, n: int) -> list[int]:
    """The node of each of the n intervals on an edge: the samples at its ends, and numbers beyond the samples'."""
    at = t.code.size + int(t.start[max(int(t.row_of[i]), 0) * 7 + d])
    return [i if q == 0 else (i + int(t.strides[d]) if q == n - 1 else at + q) for q in range(n)]


def column(t: Topology, y: int, x: int) -> Column:
    """What the column of samples at (y, x) holds, lowest first."""
    nz, ny, nx = t.code.shape
    z, out = t.grid.z, []
    for k in range(nz - 1):
        i = (k * ny + y) * nx + x
        found = edge_intervals(t, i, 2)
        for (code, low, high), node in zip(found, edge_nodes(t, i, 2, len(found)), strict=True):
            out.append((code, z[k] + low * (z[k + 1] - z[k]), z[k] + high * (z[k + 1] - z[k]), node))
    return out


def struck(
    held: Column, slowness: np.ndarray, budget: float, bottom: float
) -> tuple[float, float, int, int, np.ndarray]:
    """Floor, entry, stop, first and times of a beam in one column; the twin of `strike`."""
    solid = [(code, low, high) for code, low, high, _ in reversed(held) if code >= 0]
    met, used = np.full(len(slowness), np.inf), 0.0
    entry, first = (solid[0][2], solid[0][0]) if solid else (bottom, -1)
    for code, low, high in solid:
        met[code] = min(met[code], used)
        if used + (high - low) * slowness[code] > budget:
            return high - (budget - used) / slowness[code], entry, code, first, met
        used += (high - low) * slowness[code]
    return bottom, entry, -1, first, met


def through(held: Column, slowness: np.ndarray, film: int, passing: list[int]) -> tuple[float, float, float]:
    """Time at a film's top and bottom and its thickness where only `passing` films lie above it."""
    used, times, thick = 0.0, [np.inf, np.inf], 0.0
    for code, low, high, _ in reversed(held):
        if code == film:
            times[0] = min(times[0], used)
            used += (high - low) * slowness[code]
            times[1] = used
            thick += high - low
        elif code >= 0:
            if thick > 0 or code not in passing:
                break
            used += (high - low) * slowness[code]
    return times[0], times[1], thick


def shadow_at(t: Topology, mask: int, film: int, z: int, y: int, x: int) -> float:
    """Least value of the mask's gone field where it was laid above a sample, and above `film` on the sample's edge."""
    f, shape = t.fields, t.code.shape
    top, gone = (f.arrays[n].reshape(shape)[:, y, x].astype(float) for n in (f.top[mask], f.gone[mask]))
    floor = f.arrays[f.floor[mask]].reshape(shape)[:, y, x].astype(float)
    foot, raised = -1.0, False
    if z < shape[0] - 1:
        mine = [low for code, low, _ in edge_intervals(t, (z * shape[1] + y) * shape[2] + x, 2) if code == film]
        if mine and t.row_of[(z * shape[1] + y) * shape[2] + x] >= 0 and not _one_code(t, z, y, x):
            foot, raised = mine[0], edge_intervals(t, (z * shape[1] + y) * shape[2] + x, 2)[0][0] != film
    least = np.inf
    for k in range(z, shape[0]):
        if top[k] < 0 <= floor[k] and not (k == z and raised):
            least = min(least, gone[k])
        if k + 1 < shape[0]:
            mid = middle_of_slab(top[k : k + 2], floor[k : k + 2])
            if mid is not None and not (k == z and mid <= foot):
                least = min(least, gone[k] + mid * (gone[k + 1] - gone[k]))
    return least


def _one_code(t: Topology, z: int, y: int, x: int) -> bool:
    """Whether an upright edge is of one code, so that it has no intervals of its own."""
    _, ny, nx = t.code.shape
    return int(t.count[t.row_of[(z * ny + y) * nx + x], 2]) == 0


def middle_of_slab(top: np.ndarray, floor: np.ndarray) -> float | None:
    """Middle of the share of an edge on which linear fields have `top < 0 <= floor`, None if that is nothing."""
    cuts = sorted({0.0, 1.0, *(f[0] / (f[0] - f[1]) for f in (top, floor) if (f[0] < 0) != (f[1] < 0))})
    inside = [
        (a, b)
        for a, b in pairwise(cuts)
        if np.interp(0.5 * (a + b), [0, 1], top) < 0 <= np.interp(0.5 * (a + b), [0, 1], floor)
    ]
    if not inside or inside[-1][1] - inside[0][0] <= 1e-3:
        return None
    return 0.5 * (inside[0][0] + inside[-1][1])


def lowered(top: np.ndarray, zc: np.ndarray, z: int, depth: float) -> float:
    """A column's field, seen from above, a `depth` above sample z; the twin of `moved_down`."""
    seen = np.minimum.accumulate(top[::-1].astype(float))[::-1]
    beyond = max(zc[z] + depth - zc[-1], 0.0)
    return float(np.interp(zc[z] + depth, zc, seen) + beyond) if depth > 0 or beyond else float(seen[z])


def film_marks(t: Topology, film: int) -> np.ndarray:
    """3 for samples in a film or with it on an upright edge, 2 (solid) or 1 (void) with it on a level one, else 0."""
    code = t.code.reshape(-1)
    level, upright = np.zeros(code.size, bool), code == film
    for i in t.samples:
        for d in range(3):
            if t.count[t.row_of[i], d] and any(c == film for c, _, _ in edge_intervals(t, int(i), d)):
                (upright if d == 2 else level)[[i, i + t.strides[d]]] = True
    mark = np.where(upright, 3, np.where(level, np.where(code >= 0, 2, 1), 0))
    return mark.reshape(t.code.shape).astype(np.uint8)


def lateral_at(side: float, reached: bool, open_column: bool, behind: float, angle: float, cell: float) -> float:
    """Distance of one sample from the walls left by the masks above; the twin of `wall_distance`."""
    if np.isinf(side) and not reached and not open_column:
        side = -0.5 * cell
    if angle != 90.0:
        return float((side - behind / np.tan(np.radians(angle))) * np.sin(np.radians(angle)))
    return np.inf if reached and side < 0 else side


def mean_beside(value: np.ndarray, known: np.ndarray, at: tuple[int, int, int]) -> float:
    """Mean of the nearest kind of known neighbours of a sample: along an axis, across a face, across a corner."""
    for kind in (1, 2, 3):
        steps = [s for s in np.ndindex(3, 3, 3) if sum(abs(a - 1) for a in s) == kind]
        places = [tuple(np.add(at, s) - 1) for s in steps]
        found = [value[p] for p in places if all(0 <= a < n for a, n in zip(p, value.shape, strict=True)) and known[p]]
        if found:
            return float(np.mean(np.minimum(found, 1e6)))
    return np.inf


def lengths(t: Topology, film: int, pieces: set[int]) -> tuple[float, float]:
    """Length in all columns of a film's listed pieces, and of all of it, um; the twin of `piece_length`."""
    _, ny, nx = t.code.shape
    mine = [(high - low, t.piece[node] in pieces) for y in range(ny) for x in range(nx)
            for code, low, high, node in column(t, y, x) if code == film]  # fmt: skip
    return sum(n for n, listed in mine if listed), sum(n for n, _ in mine)


def contact(t: Topology, pieces: set[int]) -> float:
    """Area of the faces between the listed pieces and other solids, um2; the twin of `touching_area`."""
    _, ny, nx = t.code.shape
    z, cell, area = t.grid.z, t.grid.cell, 0.0
    for i in (int(s) for s in t.samples):
        k = i // (ny * nx)
        height = 0.5 * (z[min(k + 1, len(z) - 1)] - z[max(k - 1, 0)])
        for d in range(3):
            found = edge_intervals(t, i, d)
            nodes = edge_nodes(t, i, d, len(found))
            for q in range(len(found) - 1):
                solid = found[q][0] >= 0 and found[q + 1][0] >= 0
                if solid and (t.piece[nodes[q]] in pieces) != (t.piece[nodes[q + 1]] in pieces):
                    area += cell * (cell if d == 2 else height)
    return area
