"""Values carried outward from where they are known, ring after ring of samples."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

UNKNOWN = 255
MOST_BENT = 0.25  # half the curvature, per spacing, that a field is taken to have; more is not a distance's


def carried(value: np.ndarray, known: np.ndarray, z_centres: np.ndarray, dx: float, rings: int) -> np.ndarray:
    """Number of the ring, `(nz, ny, nx)` uint8, in which each sample of `value` was filled; 255 where none was.

    Parameters
    ----------
    value : (nz, ny, nx) float32, um
        A distance where `known`; filled here in the samples within `rings` of those, corner to corner.
    z_centres : (nz,) um, rising
    dx : float, um

    Notes
    -----
    A sample takes the mean over its known neighbours along the axes, else across a face, else across a corner. The
    first ring goes on along the axes with the slope and the bend of the samples before it, at most those of a
    distance, as a film's face may lie a cell beyond its last sample; the later ones take the values as they are.
    """
    ring = np.where(known, np.uint8(0), np.uint8(UNKNOWN))
    for r in range(1, rings + 1):
        _fill_ring(value, ring, r, np.asarray(z_centres, np.float64), dx)
    return ring


@njit(cache=True, parallel=True)
def _fill_ring(value, ring, r, zc, dx):
    """Fill the unknown samples beside the rings below `r`; what is written here is not read before the next ring."""
    nz, ny, nx = ring.shape
    for plane in prange(nz):
        z = np.int64(plane)
        beside = np.zeros(nx + 2, np.bool_)  # whether one of the nine samples at this x is known
        for y in range(ny):
            beside[:] = False
            for c in range(max(z - 1, 0), min(z + 2, nz)):
                for b in range(max(y - 1, 0), min(y + 2, ny)):
                    for x in range(nx):
                        beside[x + 1] |= ring[c, b, x] < r
            for x in range(nx):
                if ring[z, y, x] == UNKNOWN and (beside[x] or beside[x + 1] or beside[x + 2]):
                    total, number = _along_axes(value, ring, z, y, x, r, zc, dx)
                    if number == 0:
                        total, number = _across(value, ring, z, y, x, r)
                    value[z, y, x] = total / number
                    ring[z, y, x] = r


@njit(cache=True)
def _along_axes(value, ring, z, y, x, r, zc, dx):
    """Sum and number of the values that the neighbours along the axes lead to."""
    nz, ny, nx = ring.shape
    total = 0.0
    number = 0
    v = np.empty(3, np.float64)
    at = np.empty(3, np.float64)
    for d in range(6):
        axis, up = d // 2, 1 if d % 2 else -1
        known = 0
        for k in range(1, 4 if r == 1 else 2):
            c, b, a = z + k * up * (axis == 2), y + k * up * (axis == 1), x + k * up * (axis == 0)
            if c < 0 or b < 0 or a < 0 or c >= nz or b >= ny or a >= nx or ring[c, b, a] >= r:
                break
            v[known] = value[c, b, a]
            at[known] = abs(zc[c] - zc[z]) if axis == 2 else k * dx
            known += 1
        if known > 0:
            total += _led_on(v, at, known)
            number += 1
    return total, number


@njit(cache=True)
def _led_on(v, at, known):
    """Value at 0 of the curve through `known` values at rising places, no steeper than a distance."""
    if known == 1:
        return v[0]
    slope = (v[0] - v[1]) / (at[1] - at[0])
    if known == 3:
        bend = (slope - (v[1] - v[2]) / (at[2] - at[1])) / (at[2] - at[0])
        most = MOST_BENT / at[0]
        slope += min(max(bend, -most), most) * at[1]
    return v[0] + min(max(slope, -1.0), 1.0) * at[0]


@njit(cache=True)
def _across(value, ring, z, y, x, r):
    """The same for the neighbours across a face or, where there is none, across a corner."""
    nz, ny, nx = ring.shape
    best = 4
    total = 0.0
    number = 0
    for c in range(max(z - 1, 0), min(z + 2, nz)):
        for b in range(max(y - 1, 0), min(y + 2, ny)):
            for a in range(max(x - 1, 0), min(x + 2, nx)):
                k = abs(c - z) + abs(b - y) + abs(a - x)
                if ring[c, b, a] >= r or k > best:
                    continue
                if k < best:
                    best, total, number = k, 0.0, 0
                total += value[c, b, a]
                number += 1
    return total, number
