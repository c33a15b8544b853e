"""The surface of the solid near its boundary, from the fields that bound the films."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

PARALLEL = 1e-6  # of 1 - cosine^2: planes closer to one another's direction than this are one


@njit(cache=True)
def _slope(field, z, y, x, zc, dx, dy):
    """Central-difference gradient of a field at a sample (one-sided at the grid's sides)."""
    nz, ny, nx = field.shape
    x0, x1 = max(x - 1, 0), min(x + 1, nx - 1)
    y0, y1 = max(y - 1, 0), min(y + 1, ny - 1)
    z0, z1 = max(z - 1, 0), min(z + 1, nz - 1)
    gx = (field[z, y, x1] - field[z, y, x0]) / (max(x1 - x0, 1) * dx)
    gy = (field[z, y1, x] - field[z, y0, x]) / (max(y1 - y0, 1) * dy)
    gz = (field[z1, y, x] - field[z0, y, x]) / (zc[z1] - zc[z0]) if z1 > z0 else 0.0
    return gx, gy, gz


@njit(cache=True)
def wedge(a, b, cosine):
    """Distance to the solid behind two planes: to the face of one of them, or to the edge where they meet.

    `a` and `b` are the distances (positive outside) to the planes, whose normals have this cosine. Inside it is the
    greater of the two.
    """
    if (a <= 0 and b <= 0) or 1 - cosine * cosine < PARALLEL:
        return max(a, b)
    if a > 0 and b - a * cosine <= 0:
        return a
    if b > 0 and a - b * cosine <= 0:
        return b
    return np.sqrt((a * a + b * b - 2 * a * b * cosine) / (1 - cosine * cosine))


@njit(cache=True)
def _cosine(f, sf, g, sg, z, y, x, zc, dx, dy):
    ax, ay, az = _slope(f, z, y, x, zc, dx, dy)
    bx, by, bz = _slope(g, z, y, x, zc, dx, dy)
    n = np.sqrt((ax * ax + ay * ay + az * az) * (bx * bx + by * by + bz * bz))
    return sf * sg * (ax * bx + ay * by + az * bz) / n if n > 0.1 else 0.0


@njit(cache=True)
def _stretched(distance, field, z, y, x, zc, dx, dy, coverage):
    """A distance above zero from a plane, lengths across it counted by 1 / coverage."""
    if not 0 < distance < np.inf:
        return distance
    gx, gy, gz = _slope(field, z, y, x, zc, dx, dy)
    flat = gx * gx + gy * gy
    norm = flat + gz * gz
    return distance * np.sqrt(norm / (coverage * coverage * flat + gz * gz)) if norm > 1e-6 else distance


@njit(cache=True, parallel=True)
def lower_to_film(out, code, top, floor, gone, has_floor, has_gone, zc, dx, dy, band, coverage):
    """Lower `out` at void samples to their distance from one film's solid, up to `band`.

    Below a coverage of 1 lengths across are counted longer, by 1 / coverage.
    """
    nz, ny, nx = code.shape
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                if code[z, y, x] >= 0:
                    continue
                a = top[z, y, x]
                limit = min(out[z, y, x], band)
                if a >= limit:
                    continue
                b = -floor[z, y, x] if has_floor else -np.inf
                g = gone[z, y, x] if has_gone else -np.inf
                if b >= limit or g >= limit:
                    continue
                if coverage < 1.0:
                    a = _stretched(a, top, z, y, x, zc, dx, dy, coverage)
                    b = _stretched(b, floor, z, y, x, zc, dx, dy, coverage)
                    g = _stretched(g, gone, z, y, x, zc, dx, dy, coverage)
                d = max(a, b)
                if d + g <= 0:  # farther inside the one than outside the other: no edge is near
                    d = max(d, g)
                elif a >= b:
                    d = wedge(a, g, _cosine(top, 1.0, gone, 1.0, z, y, x, zc, dx, dy))
                else:
                    d = wedge(b, g, _cosine(floor, -1.0, gone, 1.0, z, y, x, zc, dx, dy))
                if d < out[z, y, x]:
                    out[z, y, x] = max(d, 0.0)


@njit(cache=True, parallel=True)
def solid_depths(samples, row_of, code, values, strides, shape, count, start, interval_code, interval_end):
    """Depth below the void of each near solid sample seen along its axis edges, `(m,)`; inf for none.

    The depth is the value of the field that changes sign where the void begins.
    """
    nz, ny, nx = shape
    depth = np.full(samples.size, np.inf, np.float32)
    for s in prange(samples.size):
        i = samples[s]
        if code[i] < 0:
            continue
        z = i // (ny * nx)
        y = (i // nx) % ny
        x = i % nx
        for k in range(6):
            d = k // 2
            up = k % 2 == 1
            pos = x if d == 0 else (y if d == 1 else z)
            last = nx if d == 0 else (ny if d == 1 else nz)
            if (up and pos + 1 >= last) or (not up and pos == 0):
                continue
            j = i + strides[d] if up else i - strides[d]
            r = row_of[j]
            e = np.int64(s) if up else np.int64(r)
            if r < 0 or count[e, d] == 0:
                continue
            at = start[e * 7 + d]
            n = np.int64(count[e, d])
            share = -1.0
            for q in range(n):
                w = q if up else n - 1 - q
                if interval_code[at + w] < 0:
                    low = 0.0 if w == 0 else interval_end[at + w - 1]
                    share = low if up else 1.0 - interval_end[at + w]
                    break
            if share < 0:
                continue
            best = np.inf
            for f in range(values.shape[1]):
                a = values[s, f]
                b = values[r, f]
                if (a < 0) != (b < 0) and abs(a / (a - b) - share) < 2e-3:
                    best = min(best, abs(a))
            depth[s] = min(depth[s], best)
    return depth
