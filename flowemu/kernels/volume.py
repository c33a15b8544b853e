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
def cube_share(corners: np.ndarray, work: np.ndarray, sizes: np.ndarray, level: np.ndarray) -> float:
    """Share of a cube in which all three fields of `corners` `(8, 3)` are negative."""
    values = np.empty((4, 3))
    total = 0.0
    for n in range(6):
        for i in range(4):
            for k in range(3):
                values[i, k] = corners[TETRAHEDRA[n, i], k]
        total += tetrahedron_share(values, work, sizes, level)
    return total / 6.0


@njit(cache=True)
def gather(
    field: np.ndarray, sign: float, iz: int, iy: int, ix: int, corners: np.ndarray, column: int
) -> tuple[float, float]:
    """Put a field's eight values around a cube into a column of `corners`; their least and greatest."""
    nz, ny, nx = field.shape
    low = np.inf
    high = -np.inf
    for c in range(8):
        x = min(max(ix - 1 + (c & 1), 0), nx - 1)
        y = min(max(iy - 1 + ((c >> 1) & 1), 0), ny - 1)
        z = min(max(iz - 1 + (c >> 2), 0), nz - 1)
        value = sign * field[z, y, x]
        corners[c, column] = value
        low = min(low, value)
        high = max(high, value)
    return low, high


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
    for iy in prange(ny + 1):
        corners = np.empty((8, 3))
        work = np.empty((DEEPEST, 4, 3))
        sizes = np.empty(DEEPEST)
        level = np.empty(DEEPEST, dtype=np.int64)
        total = 0.0
        for iz in range(nz + 1):
            for ix in range(nx + 1):
                low, high = gather(top, 1.0, iz, iy, ix, corners, 0)
                if low >= 0.0:
                    continue
                low, above = gather(floor, -1.0, iz, iy, ix, corners, 1)
                if low >= 0.0:
                    continue
                low, beyond = gather(gone, 1.0, iz, iy, ix, corners, 2)
                if low >= 0.0:
                    continue
                volume = dx[ix] * dy[iy] * dz[iz]
                if max(high, above, beyond) > 0.0:
                    volume *= cube_share(corners, work, sizes, level)
                total += volume
        out[iy] = total
    return out
