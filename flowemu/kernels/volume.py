"""Volume where one field is negative, one is not, and a third is negative, linear on tetrahedra."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

# The six tetrahedra of a cube that share its long diagonal, by corner number x + 2 y + 4 z.
TETRAHEDRA = np.array(
    [[0, 1, 3, 7], [0, 1, 5, 7], [0, 2, 3, 7], [0, 2, 6, 7], [0, 4, 5, 7], [0, 4, 6, 7]], dtype=np.int64
)
DEEPEST = 64


@njit(cache=True)
def tetrahedron_share(values: np.ndarray, work: np.ndarray, sizes: np.ndarray, level: np.ndarray) -> float:
    """Share of one tetrahedron in which all three linear fields are negative.

    An edge that a field crosses is split at the crossing, which divides the tetrahedron's volume in
    the same ratio, until no edge is crossed; pieces are kept or dropped whole.

    Parameters
    ----------
    values : (4, 3) float64, the fields at the corners
    work, sizes, level : (DEEPEST, 4, 3), (DEEPEST,) float64 and (DEEPEST,) int64, scratch
    """
    work[0] = values
    sizes[0] = 1.0
    level[0] = 0
    count = 1
    total = 0.0
    while count > 0:
        count -= 1
        field = level[count]
        low = 0
        high = 0
        for i in range(1, 4):
            if work[count, i, field] < work[count, low, field]:
                low = i
            if work[count, i, field] > work[count, high, field]:
                high = i
        if work[count, low, field] >= 0.0:
            continue
        if work[count, high, field] <= 0.0:
            if field == 2:
                total += sizes[count]
            else:
                level[count] = field + 1
                count += 1
            continue
        below = -work[count, low, field]
        t = below / (below + work[count, high, field])
        work[count + 1] = work[count]
        for k in range(3):
            middle = (1.0 - t) * work[count, low, k] + t * work[count, high, k]
            work[count, high, k] = middle
            work[count + 1, low, k] = middle
        work[count, high, field] = 0.0
        work[count + 1, low, field] = 0.0
        sizes[count + 1] = sizes[count] * (1.0 - t)
        sizes[count] *= t
        level[count + 1] = field
        count += 2
    return total


@njit(cache=True)
def below_share(a: float, b: float, c: float, d: float) -> float:
    """Share of a tetrahedron in which one linear field with these corner values is negative."""
    if max(max(a, b), max(c, d)) <= 0:
        return 1.0
    turned = int(a < 0) + int(b < 0) + int(c < 0) + int(d < 0) == 3
    if turned:
        a, b, c, d = -a, -b, -c, -d
    for _ in range(3):  # the lowest first
        if b < a:
            a, b = b, a
        if c < b:
            b, c = c, b
        if d < c:
            c, d = d, c
    if a >= 0:
        share = 0.0
    else:
        p, q = a / (a - c), a / (a - d)
        if b >= 0:
            share = a / (a - b) * p * q
        else:
            r, s = b / (b - c), b / (b - d)
            share = p * q + s * p * (1.0 - q) + (1.0 - p) * r * s
    return 1.0 - share if turned else share


@njit(cache=True)
def cube_share(
    corners: np.ndarray, values: np.ndarray, work: np.ndarray, sizes: np.ndarray, level: np.ndarray
) -> float:
    """Share of a cube in which all three fields of `corners` `(8, 3)` are negative; the rest is scratch."""
    total = 0.0
    for n in range(6):
        crossing = -1
        several = False
        empty = False
        for k in range(3):
            low, high = np.inf, -np.inf
            for i in range(4):
                v = corners[TETRAHEDRA[n, i], k]
                values[i, k] = v
                low, high = min(low, v), max(high, v)
            empty |= low >= 0.0
            if high > 0.0:
                several = crossing >= 0
                crossing = k
        if empty:
            continue
        if crossing < 0:
            total += 1.0
        elif several:
            total += tetrahedron_share(values, work, sizes, level)
        else:
            total += below_share(values[0, crossing], values[1, crossing], values[2, crossing], values[3, crossing])
    return total / 6.0


@njit(cache=True)
def gather(field: np.ndarray, sign: float, iz: int, iy: int, ix: int, corners: np.ndarray, column: int) -> None:
    """Put a field's eight values around a cube into a column of `corners`."""
    nz, ny, nx = field.shape
    for c in range(8):
        x = min(max(ix - 1 + (c & 1), 0), nx - 1)
        y = min(max(iy - 1 + ((c >> 1) & 1), 0), ny - 1)
        z = min(max(iz - 1 + (c >> 2), 0), nz - 1)
        corners[c, column] = sign * field[z, y, x]


@njit(cache=True)
def _field_share(field: np.ndarray, sign: float, iz: int, iy: int, ix: int, corners: np.ndarray) -> float:
    """Share of a cube in which one field is negative; `corners (8, 3)` is scratch."""
    gather(field, sign, iz, iy, ix, corners, 0)
    total = 0.0
    for n in range(6):
        a, b = corners[TETRAHEDRA[n, 0], 0], corners[TETRAHEDRA[n, 1], 0]
        c, d = corners[TETRAHEDRA[n, 2], 0], corners[TETRAHEDRA[n, 3], 0]
        total += below_share(a, b, c, d)
    return total / 6.0


@njit(cache=True)
def _some_below(plane: np.ndarray) -> bool:
    """Whether a plane `(ny, nx)` has a negative sample."""
    for y in range(plane.shape[0]):
        some = np.uint8(0)
        for x in range(plane.shape[1]):  # no way out of this loop, so that it runs on several samples at once
            some |= np.uint8(plane[y, x] < np.float32(0))
        if some:
            return True
    return False


@njit(cache=True)
def _some_above(plane: np.ndarray) -> bool:
    """Whether a plane `(ny, nx)` has a positive sample."""
    for y in range(plane.shape[0]):
        some = np.uint8(0)
        for x in range(plane.shape[1]):
            some |= np.uint8(plane[y, x] > np.float32(0))
        if some:
            return True
    return False


@njit(cache=True, parallel=True)
def _inside_planes(top: np.ndarray, floor: np.ndarray, gone: np.ndarray) -> np.ndarray:
    """Planes in which `top < 0`, `floor > 0` and `gone < 0` somewhere, each for itself, `(nz, 3)` bool."""
    nz = top.shape[0]
    found = np.zeros((nz, 3), np.bool_)
    for plane in prange(nz):
        z = np.int64(plane)
        found[z, 0] = _some_below(top[z])
        found[z, 1] = _some_above(floor[min(z, floor.shape[0] - 1)])
        found[z, 2] = _some_below(gone[min(z, gone.shape[0] - 1)])
    return found


@njit(cache=True)
def _enter_sides(row: np.ndarray, field: np.ndarray, sign: float, z: int, y: int, bit: int) -> None:
    """Enter into the `row (nx,)` of a field's samples, as bits, which sides of zero they are on.

    From `bit` on: negative, positive, zero.
    """
    nx = row.size
    if field.size == 1:
        row |= np.uint16((1 if sign * field[0, 0, 0] < 0 else 2) << bit)
        return
    for x in range(nx):
        v = sign * field[z, y, x]
        row[x] |= np.uint16((1 if v < 0 else (2 if v > 0 else 4)) << bit)


@njit(cache=True)
def _cube_volume(
    top: np.ndarray, floor: np.ndarray, gone: np.ndarray, sides: int, iz: int, iy: int, ix: int,
    corners: np.ndarray, values: np.ndarray, work: np.ndarray, sizes: np.ndarray, level: np.ndarray,
) -> float:  # fmt: skip
    """Share of a cube that some field crosses, from the sides that its corners are on; the rest is scratch."""
    if sides & (2 | 48 | 384) == 2:
        return _field_share(top, 1.0, iz, iy, ix, corners)
    if sides & (6 | 16 | 384) == 16:
        return _field_share(floor, -1.0, iz, iy, ix, corners)
    if sides & (6 | 48 | 128) == 128:
        return _field_share(gone, 1.0, iz, iy, ix, corners)
    gather(top, 1.0, iz, iy, ix, corners, 0)
    gather(floor, -1.0, iz, iy, ix, corners, 1)
    gather(gone, 1.0, iz, iy, ix, corners, 2)
    return cube_share(corners, values, work, sizes, level)


@njit(cache=True, parallel=True)
def row_volumes(
    top: np.ndarray, floor: np.ndarray, gone: np.ndarray, dx: np.ndarray, dy: np.ndarray, dz: np.ndarray
) -> np.ndarray:
    """Volume of `top < 0, floor >= 0, gone < 0` between each two rows of samples.

    Beyond the outermost samples the fields stay constant, as they do at a mirror.

    Parameters
    ----------
    top, floor, gone : (nz, ny, nx) float32; a field of shape (1, 1, 1) holds everywhere
    dx, dy, dz : (nx + 1,), (ny + 1,), (nz + 1,) float64, widths from edge to sample to edge

    Returns
    -------
    volumes : (ny + 1,) float64
    """
    nz, ny, nx = top.shape
    out = np.zeros(ny + 1)
    here = _inside_planes(top, floor, gone)
    full = np.empty(nz + 1, np.bool_)  # layers of cubes that may hold something
    for iz in range(nz + 1):
        full[iz] = (here[max(iz - 1, 0)] | here[min(iz, nz - 1)]).all()
    for row in prange(ny + 1):
        iy = np.int64(row)
        corners, values = np.empty((8, 3)), np.empty((4, 3))
        work, sizes, level = np.empty((DEEPEST, 4, 3)), np.empty(DEEPEST), np.empty(DEEPEST, dtype=np.int64)
        sides = np.zeros((2, nx), np.uint16)  # of the two planes of a layer of cubes
        known = -1  # the plane in sides[1]
        total = 0.0
        for iz in range(nz + 1):
            if not full[iz]:
                continue
            for z in (max(iz - 1, 0), min(iz, nz - 1)):
                sides[0] = sides[1]
                if z != known:
                    sides[1] = 0
                    for y in (max(iy - 1, 0), min(iy, ny - 1)):
                        _enter_sides(sides[1], top, 1.0, z, y, 0)
                        _enter_sides(sides[1], floor, -1.0, z, y, 3)
                        _enter_sides(sides[1], gone, 1.0, z, y, 6)
                    known = z
            for ix in range(nx + 1):
                a, b = max(ix - 1, 0), min(ix, nx - 1)
                cube = np.int64(sides[0, a] | sides[0, b] | sides[1, a] | sides[1, b])
                if cube & 73 != 73:  # some field is negative at no corner
                    continue
                volume = dx[ix] * dy[iy] * dz[iz]
                if cube & 146:  # some field is positive at a corner
                    volume *= _cube_volume(top, floor, gone, cube, iz, iy, ix, corners, values, work, sizes, level)
                total += volume
        out[iy] = total
    return out
