"""Slow, plain twins of `kernels.regions` and of what is built on it, and random small stacks to compare them on.

Fields are linear on the six tetrahedra of a cell that share its long diagonal; the twins of pieces, bodies and bare
areas look at the fields on a lattice that is many times finer, and know nothing of edges or intervals.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy import ndimage

from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology

SLIVER, CRACK = 2e-5, 0.02  # as in the kernel: shorter intervals are dropped, thinner voids between solids closed
Bounds = Sequence[tuple[int, int, int]]  # columns of top, floor and gone of each film, -1 for none

# A point's neighbours along the edges of the tetrahedra: seven ways and back.
ALONG = np.zeros((3, 3, 3), bool)
for _z, _y, _x in [(0, 0, 0), (0, 0, 1), (0, 1, 0), (1, 0, 0), (0, 1, 1), (1, 0, 1), (1, 1, 0), (1, 1, 1)]:
    ALONG[1 + _z, 1 + _y, 1 + _x] = ALONG[1 - _z, 1 - _y, 1 - _x] = True


def code_of(values: Sequence[float], films: Bounds) -> int:
    """The film at a point, oldest first; else -1, or -1 - k under film k, the first one laid since it was last void."""
    roof = 0
    for k, (top, floor, gone) in enumerate(films):
        below_top = values[top] < 0
        above_floor = floor < 0 or values[floor] >= 0
        taken = gone >= 0 and values[gone] >= 0
        if below_top and above_floor and not taken:
            return k
        if below_top and above_floor:
            roof = 0
        elif below_top and roof == 0:
            roof = k
    return -1 - roof


def intervals(a: Sequence[float], b: Sequence[float], films: Bounds) -> list[tuple[int, float]]:
    """(code, upper end) along the edge between two samples of these field values."""
    cuts = sorted(float(u) / (float(u) - float(v)) for u, v in zip(a, b, strict=True) if (u < 0) != (v < 0))
    out: list[tuple[int, float]] = []
    low = 0.0
    for j, high in enumerate([*cuts, 1.0]):
        inner = 0 < j < len(cuts)
        if inner and high - low < SLIVER:
            continue
        s = 0.5 * (low + high) if inner else (0.0 if j == 0 else 1.0)
        code = code_of([u + s * (v - u) for u, v in zip(a, b, strict=True)], films)
        if out and out[-1][0] == code:
            out[-1] = (code, high)
        else:
            out.append((code, high))
        low = high
    out[-1] = (out[-1][0], 1.0)
    return without_cracks(out)


def without_cracks(runs: list[tuple[int, float]]) -> list[tuple[int, float]]:
    """The same with thin voids between two solids closed: midway, or altogether inside one film."""
    for q in range(1, len(runs) - 1):
        (before, low), (code, high), (after, end) = runs[q - 1 : q + 2]
        if code < 0 <= before and after >= 0 and high - low < CRACK:
            closed = [(before, end)] if before == after else [(before, 0.5 * (low + high)), (after, end)]
            return without_cracks([*runs[: q - 1], *closed, *runs[q + 2 :]])
    return runs


def refined(field: np.ndarray, fine: int) -> np.ndarray:
    """A field at the middles of `fine` parts of every cell's edges, linear on tetrahedra, `(fine x cells, ...)`."""
    nz, ny, nx = field.shape
    at = (np.arange(fine) + 0.5) / fine
    place = [np.arange(n - 1).repeat(fine) for n in (nz, ny, nx)]
    share = np.meshgrid(*(np.tile(at, n - 1) for n in (nz, ny, nx)), indexing="ij")
    corner = list(np.meshgrid(*place, indexing="ij"))
    order = np.argsort(-np.stack(share), axis=0, kind="stable")
    value = field[tuple(corner)].astype(float)
    for step in range(3):
        before = field[tuple(corner)].astype(float)
        for axis in range(3):
            corner[axis] = corner[axis] + (order[step] == axis)
        along = np.take_along_axis(np.stack(share), order[step][None], axis=0)[0]
        value += along * (field[tuple(corner)] - before)
    return value


def refined_codes(stack: FilmStack, fine: int) -> np.ndarray:
    """Film numbers on the finer lattice, -1 in every void."""
    code: np.ndarray | None = None
    for k, film in enumerate(stack.films):
        inside = refined(film.top, fine) < 0
        if film.floor is not None:
            inside &= refined(film.floor, fine) >= 0
        if film.gone is not None:
            inside &= refined(film.gone, fine) < 0
        code = np.full(inside.shape, -1) if code is None else code
        code[inside & (code < 0)] = k
    assert code is not None
    return code


def labels_of(code: np.ndarray, bodies: bool) -> np.ndarray:
    """Labels of the pieces on a lattice (voids, and each film by itself), or of the bodies (voids, and all solids)."""
    out = np.zeros(code.shape, np.int64)
    for mine in [code < 0, code >= 0] if bodies else [code == k for k in range(-1, code.max() + 1)]:
        label, _ = ndimage.label(mine, structure=ALONG)
        out = np.where(mine, label + out.max(), out)
    return out


def open_void(code: np.ndarray) -> np.ndarray:
    """The voids of a lattice that its top plane belongs to."""
    label, _ = ndimage.label(code < 0, structure=ALONG)
    tops = np.unique(label[-1])
    return np.isin(label, tops[tops > 0])


def projected_areas(code: np.ndarray, k: int, pitch: float) -> list[float]:
    """Area of film k's bare faces as seen along x, y and z, by counting on lines of the lattice, um2."""
    opened, mine = open_void(code), code == k
    out = []
    for axis in (2, 1, 0):
        a, b = np.moveaxis(mine, axis, 0), np.moveaxis(opened, axis, 0)
        out.append(float(((a[1:] & b[:-1]) | (b[1:] & a[:-1])).sum()) * pitch**2)
    return out


def random_stack(seed: int, n: int = 6, cut_all: bool = True) -> FilmStack:
    """A wafer under two or three slabs of 0.35 to 1.2 cells, slanting a little, cut by slanting planes.

    All but the second are cut, or the last one alone.
    """
    rng = np.random.default_rng(seed)
    grid = Grid(0.0, 0.0, 1.0, n, n, np.arange(n + 1.0))
    z, y, x = np.meshgrid(grid.z, grid.y, grid.x, indexing="ij")
    middle = n / 2

    def slope(size: float) -> np.ndarray:
        a, b = rng.uniform(-size, size, 2)
        return a * (x - middle) + b * (y - middle)

    surface = z - rng.uniform(1.1, 1.9) - slope(0.15)
    films = [Film("wafer", "silicon", None, 0, surface.astype(np.float32))]
    last = int(rng.integers(2, 4))
    for number in range(1, last + 1):
        floor = films[-1].top
        thickness = np.maximum(rng.uniform(0.35, 1.2) + slope(0.05), 0.3)
        top = (floor - thickness).astype(np.float32)
        angle = rng.uniform(0, 2 * np.pi)
        cut = np.cos(angle) * (x - middle) + np.sin(angle) * (y - middle) - rng.uniform(-1.2, 1.2)
        gone = (cut + rng.uniform(-0.4, 0.4) * (z - middle)).astype(np.float32)
        gone = gone if number == last or (cut_all and number != 2) else None
        films.append(Film(f"film {number}", "x", None, number, top, floor, gone))
    stack = FilmStack(grid, tuple(films), films[-1].top)
    stack.__dict__["topology"] = Topology.of(grid, films)
    return stack
