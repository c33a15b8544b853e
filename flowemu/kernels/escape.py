"""Whether a loose body, moved by an offset, runs into the rest of the structure."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True)
def _among(keys, key):
    low = np.searchsorted(keys, key)
    return low < keys.size and keys[low] == key


@njit(cache=True)
def leaving_points(samples, code, strides, shape, count, start, interval_code, interval_end, piece, pieces, zc, dx, dy):
    """Points on axis edges where the listed pieces end, `(m, 3)` um from the first sample in x and y."""
    _, ny, nx = shape
    n = code.size
    total = 0
    out = np.empty((0, 3), np.float64)
    for fill in range(2):
        if fill == 1:
            out = np.empty((total, 3), np.float64)
            total = 0
        for s in range(samples.size):
            i = samples[s]
            z = i // (ny * nx)
            y = (i // nx) % ny
            x = i % nx
            for d in range(3):
                m = np.int64(count[s, d])
                at = start[s * 7 + d]
                j = i + strides[d]
                for q in range(m - 1):
                    a = piece[i] if q == 0 else piece[n + at + q]
                    b = piece[j] if q + 1 == m - 1 else piece[n + at + q + 1]
                    if (interval_code[at + q] >= 0 and _among(pieces, a)) == (
                        interval_code[at + q + 1] >= 0 and _among(pieces, b)
                    ):
                        continue
                    if fill == 1:
                        share = interval_end[at + q]
                        out[total, 0] = (x + (share if d == 0 else 0.0)) * dx
                        out[total, 1] = (y + (share if d == 1 else 0.0)) * dy
                        out[total, 2] = zc[z] + (share * (zc[z + 1] - zc[z]) if d == 2 else 0.0)
                    total += 1
    return out


@njit(cache=True)
def _trilinear(field, z, y, x, wz, wy, wx, z1, y1, x1):
    low = (field[z, y, x] * (1 - wx) + field[z, y, x1] * wx) * (1 - wy) + (
        field[z, y1, x] * (1 - wx) + field[z, y1, x1] * wx
    ) * wy
    high = (field[z1, y, x] * (1 - wx) + field[z1, y, x1] * wx) * (1 - wy) + (
        field[z1, y1, x] * (1 - wx) + field[z1, y1, x1] * wx
    ) * wy
    return low * (1 - wz) + high * wz


@njit(cache=True)
def film_boxes(samples, code, count, start, interval_code, strides, films):
    """Where each film is, in sample numbers: `(films, 6)` int64, least and greatest x, y, z, a sample to spare."""
    nz, ny, nx = code.shape
    flat = code.reshape(-1)
    box = np.empty((films, 6), np.int64)
    box[:, ::2] = flat.size
    box[:, 1::2] = -2
    for z in range(nz):
        for y in range(ny):
            for x in range(nx):
                if code[z, y, x] >= 0:
                    _widen(box, code[z, y, x], x, y, z)
    for s in range(samples.size):
        for d in range(7):
            for q in range(1, np.int64(count[s, d]) - 1):
                k = interval_code[start[s * 7 + d] + q]
                if k >= 0:
                    for i in (samples[s], samples[s] + strides[d]):
                        _widen(box, k, i % nx, (i // nx) % ny, i // (ny * nx))
    return box


@njit(cache=True)
def _widen(box, k, x, y, z):
    """Take a sample into film k's box."""
    box[k, 0], box[k, 1] = min(box[k, 0], x - 1), max(box[k, 1], x + 1)
    box[k, 2], box[k, 3] = min(box[k, 2], y - 1), max(box[k, 3], y + 1)
    box[k, 4], box[k, 5] = min(box[k, 4], z - 1), max(box[k, 5], z + 1)


@njit(cache=True)
def point_inside(
    points, offset, cosine, sine, centre, begin, allowed, top, floor, gone, has_floor, has_gone, film, box, shared,
    code, piece, pieces, x0, y0, cell, zc,
):  # fmt: skip
    """Number of a point, `(m, 3)`, deeper than `allowed` um in one film of the rest, looked for from `begin` on; or -1.

    The points are turned about the upright through `centre (2,)` and moved by `offset (3,)` first.
    `box (6,)` is the film's of `film_boxes`. Where the film is `shared` with the body itself, a point counts
    only if a sample of the film beside it belongs to another piece. Points outside the window's sides are carried
    in, as in a mirror.
    """
    nz, ny, nx = top.shape
    low, high = zc[min(max(box[4], 0), nz - 1)], zc[min(max(box[5], 0), nz - 1)]
    for m in range(points.shape[0]):
        k = begin + m if begin + m < points.shape[0] else begin + m - points.shape[0]
        at_z = points[k, 2] + offset[2]
        if at_z >= zc[nz - 1] or at_z <= zc[0]:
            if at_z <= zc[0] and film == 0 and cell > allowed:
                return k
            continue
        if at_z < low or at_z > high:
            continue
        away_x, away_y = points[k, 0] - centre[0], points[k, 1] - centre[1]
        at_x = centre[0] + cosine * away_x - sine * away_y + offset[0]
        at_y = centre[1] + sine * away_x + cosine * away_y + offset[1]
        fx = min(max((at_x - x0) / cell, 0.0), nx - 1.0)
        fy = min(max((at_y - y0) / cell, 0.0), ny - 1.0)
        if fx < box[0] or fx > box[1] or fy < box[2] or fy > box[3]:
            continue
        x = min(int(fx), max(nx - 2, 0))
        y = min(int(fy), max(ny - 2, 0))
        z = min(max(np.searchsorted(zc, at_z) - 1, 0), nz - 2)
        x1 = min(x + 1, nx - 1)
        y1 = min(y + 1, ny - 1)
        wz = (at_z - zc[z]) / (zc[z + 1] - zc[z])
        wx = fx - x
        wy = fy - y
        if -_trilinear(top, z, y, x, wz, wy, wx, z + 1, y1, x1) <= allowed:
            continue
        if has_floor and _trilinear(floor, z, y, x, wz, wy, wx, z + 1, y1, x1) <= allowed:
            continue
        if has_gone and -_trilinear(gone, z, y, x, wz, wy, wx, z + 1, y1, x1) <= allowed:
            continue
        if not shared or _beside_another(film, z, y, x, code, piece, pieces, ny, nx):
            return k
    return -1


@njit(cache=True)
def _beside_another(film, z, y, x, code, piece, pieces, ny, nx):
    """Whether a corner of a cell is in the film but in none of the pieces."""
    wide_y, wide_x = code.shape[1], code.shape[2]
    for c in range(8):
        a = z + (c >> 2)
        b = min(y + ((c >> 1) & 1), ny - 1)
        d = min(x + (c & 1), nx - 1)
        if code[a, b, d] == film and not _among(pieces, piece[(a * wide_y + b) * wide_x + d]):
            return True
    return False
