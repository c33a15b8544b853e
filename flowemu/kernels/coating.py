"""Small passes over a surface field that coatings need."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

KINK = 0.5  # share by which the slopes on two sides may differ where a field still counts as smooth


@njit(cache=True)
def _slope(field, z, y, x, zc, dx, dy):
    nz, ny, nx = field.shape
    x0, x1 = max(x - 1, 0), min(x + 1, nx - 1)
    y0, y1 = max(y - 1, 0), min(y + 1, ny - 1)
    z0, z1 = max(z - 1, 0), min(z + 1, nz - 1)
    gx = (field[z, y, x1] - field[z, y, x0]) / (max(x1 - x0, 1) * dx)
    gy = (field[z, y1, x] - field[z, y0, x]) / (max(y1 - y0, 1) * dy)
    gz = (field[z1, y, x] - field[z0, y, x]) / (zc[z1] - zc[z0]) if z1 > z0 else 0.0
    return gx, gy, gz


@njit(cache=True, parallel=True)
def extent(surface, zc, dx, dy, coverage):
    """Extent of the ellipsoid with semi-axes (coverage, coverage, 1) along the surface's normal."""
    nz, ny, nx = surface.shape
    out = np.ones((nz, ny, nx), np.float32)
    if coverage == 1.0:
        return out
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                gx, gy, gz = _slope(surface, z, y, x, zc, dx, dy)
                flat = gx * gx + gy * gy
                norm = flat + gz * gz
                if norm > 1e-6:
                    out[z, y, x] = np.sqrt((coverage * coverage * flat + gz * gz) / norm)
    return out


@njit(cache=True)
def _slope_along(before, here, after, low, high, has_low, has_high):
    """Derivative along an axis: central where both sides agree, else towards the lesser neighbour that counts."""
    if has_low and has_high:
        a = (here - before) / low
        b = (after - here) / high
        if abs(a - b) < KINK * max(abs(a), abs(b)):
            return (a * high + b * low) / (low + high)
        if min(before, after) >= here:
            return 0.0
        return a if before < after else b
    if has_high:
        return (after - here) / high
    if has_low:
        return (here - before) / low
    return 0.0


@njit(cache=True, parallel=True)
def normalise(field, counts, zc, dx, dy):
    """The field divided by the size of its gradient, so that it is a distance near its zero.

    The gradient is upwind where fronts meet, as the kink there would move its zero. Only
    neighbours that `counts` marks, `(nz, ny, nx)` bool, enter.
    """
    nz, ny, nx = field.shape
    out = field.copy()
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                f = field[z, y, x]
                x0, x1, y0, y1, z0, z1 = max(x - 1, 0), min(x + 1, nx - 1), max(y - 1, 0), min(y + 1, ny - 1), max(z - 1, 0), min(z + 1, nz - 1)  # fmt: skip
                gx = _slope_along(field[z, y, x0], f, field[z, y, x1], dx, dx, x > 0 and counts[z, y, x0], x + 1 < nx and counts[z, y, x1])  # fmt: skip
                gy = _slope_along(field[z, y0, x], f, field[z, y1, x], dy, dy, y > 0 and counts[z, y0, x], y + 1 < ny and counts[z, y1, x])  # fmt: skip
                gz = _slope_along(field[z0, y, x], f, field[z1, y, x], zc[z] - zc[z0], zc[z1] - zc[z], z > 0 and counts[z0, y, x], z + 1 < nz and counts[z1, y, x])  # fmt: skip
                norm = np.sqrt(gx * gx + gy * gy + gz * gz)
                if norm > 0.1:
                    out[z, y, x] = f / norm
    return out


@njit(cache=True, parallel=True)
def heights(surface, zc):
    """Height of the topmost crossing from void to solid in every column, `(ny, nx)`, um."""
    nz, ny, nx = surface.shape
    out = np.full((ny, nx), zc[0], np.float64)
    for y in prange(ny):
        for x in range(nx):
            if surface[nz - 1, y, x] < 0:
                out[y, x] = zc[nz - 1]
                continue
            for z in range(nz - 2, -1, -1):
                a = surface[z, y, x]
                if a < 0:
                    b = surface[z + 1, y, x]
                    out[y, x] = zc[z] + a / (a - b) * (zc[z + 1] - zc[z])
                    break
    return out
