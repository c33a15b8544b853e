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
def slope_sizes(field, counts, zc, dx, dy):
    """Size of the field's gradient at every sample, `(nz, ny, nx)` float32; 1 where it is next to nothing.

    The gradient is upwind where fronts meet. Only neighbours that `counts` marks, bool, enter.
    """
    nz, ny, nx = field.shape
    out = np.ones((nz, ny, nx), np.float32)
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                f = field[z, y, x]
                x0, x1 = max(x - 1, 0), min(x + 1, nx - 1)
                y0, y1 = max(y - 1, 0), min(y + 1, ny - 1)
                z0, z1 = max(z - 1, 0), min(z + 1, nz - 1)
                has_x0, has_x1 = x > 0 and counts[z, y, x0], x + 1 < nx and counts[z, y, x1]
                has_y0, has_y1 = y > 0 and counts[z, y0, x], y + 1 < ny and counts[z, y1, x]
                has_z0, has_z1 = z > 0 and counts[z0, y, x], z + 1 < nz and counts[z1, y, x]
                gx = _slope_along(field[z, y, x0], f, field[z, y, x1], dx, dx, has_x0, has_x1)
                gy = _slope_along(field[z, y0, x], f, field[z, y1, x], dy, dy, has_y0, has_y1)
                low, high = zc[z] - zc[z0], zc[z1] - zc[z]
                gz = _slope_along(field[z0, y, x], f, field[z1, y, x], low, high, has_z0, has_z1)
                norm = np.sqrt(gx * gx + gy * gy + gz * gz)
                if norm > 0.1:
                    out[z, y, x] = norm
    return out


@njit(cache=True, parallel=True)
def scaled_down(field, size):
    """The field over `size`; beside its zero over the mean of what the two sides have, so that the zero stays."""
    nz, ny, nx = field.shape
    out = np.empty((nz, ny, nx), np.float32)
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                inside = field[z, y, x] < 0
                total = size[z, y, x]
                n = 1
                for k in range(6):
                    a = z + (k == 0) - (k == 1)
                    b = y + (k == 2) - (k == 3)
                    c = x + (k == 4) - (k == 5)
                    if 0 <= a < nz and 0 <= b < ny and 0 <= c < nx and (field[a, b, c] < 0) != inside:
                        total += size[a, b, c]
                        n += 1
                out[z, y, x] = field[z, y, x] * n / total
    return out


def normalise(field, counts, zc, dx, dy):
    """The field made a distance near its zero, which it keeps as far as it can; see `slope_sizes`."""
    return scaled_down(field, slope_sizes(field, counts, zc, dx, dy))


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


@njit(cache=True, parallel=True)
def kept_out(sealed, surface, band):
    """A removed field that keeps a film out of sealed voids, `(nz, ny, nx)` float32.

    Positive in them and, by next to nothing, at the samples beside them, so that the film ends at
    their walls; minus the band elsewhere.
    """
    nz, ny, nx = sealed.shape
    out = np.full((nz, ny, nx), -band, np.float32)
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                if sealed[z, y, x]:
                    out[z, y, x] = max(surface[z, y, x], 1e-4)
                    continue
                for a in range(max(z - 1, 0), min(z + 2, nz)):
                    for b in range(max(y - 1, 0), min(y + 2, ny)):
                        for c in range(max(x - 1, 0), min(x + 2, nx)):
                            if sealed[a, b, c]:
                                out[z, y, x] = 1e-4
    return out


@njit(cache=True)
def _cover_triangle(top, out, f, g, counts, least, i, j, k):
    """Lower `out` at three samples so that `top` would be at most -least where f and g are both zero between them."""
    f0, f1, f2 = f[i], f[j] - f[i], f[k] - f[i]
    g0, g1, g2 = g[i], g[j] - g[i], g[k] - g[i]
    d = f1 * g2 - f2 * g1
    if abs(d) < 1e-12:
        return
    u = (f2 * g0 - f0 * g2) / d
    v = (f0 * g1 - f1 * g0) / d
    if u < 0 or v < 0 or u + v > 1:
        return
    w = 1 - u - v
    much = w * top[i] + u * top[j] + v * top[k] + least
    if much <= 0:
        return
    total = (w * w if counts[i] else 0.0) + (u * u if counts[j] else 0.0) + (v * v if counts[k] else 0.0)
    if total < 1e-6:
        return
    if counts[i]:
        out[i] = min(out[i], top[i] - much * w / total)
    if counts[j]:
        out[j] = min(out[j], top[j] - much * u / total)
    if counts[k]:
        out[k] = min(out[k], top[k] - much * v / total)


@njit(cache=True)
def cover_corners(top, face, gone, open_space, least):
    """`top` lowered in the open samples round each corner of a film, so that the corner lies `least` um under it.

    A corner is where `face` (the film's top or floor) and `gone` are both zero. The grid's faces are divided along
    either diagonal, so that a mirrored film comes out mirrored.
    """
    nz, ny, nx = top.shape
    out = top.copy()
    t, low, f, g, counts = top.reshape(-1), out.reshape(-1), face.reshape(-1), gone.reshape(-1), open_space.reshape(-1)
    steps = ((1, nx, 0, 1, 1), (1, ny * nx, 1, 0, 1), (nx, ny * nx, 1, 1, 0))
    for z in range(nz):
        for y in range(ny):
            for x in range(nx):
                i = (z * ny + y) * nx + x
                for a, b, dz, dy, dx in steps:
                    if z + dz >= nz or y + dy >= ny or x + dx >= nx:
                        continue
                    below = (f[i] < 0) + (f[i + a] < 0) + (f[i + b] < 0) + (f[i + a + b] < 0)
                    if below == 0 or below == 4:
                        continue
                    cut = (g[i] < 0) + (g[i + a] < 0) + (g[i + b] < 0) + (g[i + a + b] < 0)
                    if cut == 0 or cut == 4:
                        continue
                    _cover_triangle(t, low, f, g, counts, least, i, i + a, i + a + b)
                    _cover_triangle(t, low, f, g, counts, least, i, i + b, i + a + b)
                    _cover_triangle(t, low, f, g, counts, least, i + a, i, i + b)
                    _cover_triangle(t, low, f, g, counts, least, i + a, i + a + b, i + b)
    return out
