"""What a vertical beam meets in the columns of samples, and lengths of films along them.

Times are spent along the columns' edges, whose intervals (see `kernels.regions`) are exact to a
small fraction of a cell; direction 2 of a sample's edges leads upward. A thread works on rows of
columns, plane after plane, so that memory is read in order.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange


@njit(cache=True, parallel=True)
def strike(code, row_of, count, start, interval_code, interval_end, zc, slowness, budget):
    """How far down a beam gets in every column within `budget` s.

    Parameters
    ----------
    code : (nz, ny, nx) int16
    slowness : (films,) float64, s/um, inf where a film is not etched

    Returns
    -------
    floor : (ny, nx) float64, um; height at which the beam is (the grid's lowest sample if through)
    entry : (ny, nx) float64, um; height at which it first met a solid
    stop : (ny, nx) int32; film it is in or stopped at, -1 if none
    first : (ny, nx) int32; film it met first, -1 if none
    met : (films, ny, nx) float64, s; when it first met each film, inf where it did not within the budget
    """
    nz, ny, nx = code.shape
    floor = np.full((ny, nx), zc[0])
    entry = np.full((ny, nx), zc[0])
    stop = np.full((ny, nx), -1, np.int32)
    first = np.full((ny, nx), -1, np.int32)
    met = np.full((slowness.size, ny, nx), np.inf)
    for y in prange(ny):
        used = np.zeros(nx)
        left = nx
        z = nz - 2
        while z >= 0 and left > 0:
            span = zc[z + 1] - zc[z]
            for x in range(nx):
                if stop[y, x] >= 0:
                    continue
                s = row_of[(z * ny + y) * nx + x]
                n = np.int64(count[s, 2]) if s >= 0 else 0
                high = 1.0
                for q in range(max(n, 1) - 1, -1, -1):
                    if n > 0:
                        c = interval_code[start[s * 7 + 2] + q]
                        low = interval_end[start[s * 7 + 2] + q - 1] if q > 0 else 0.0
                    else:
                        c = code[z, y, x]
                        low = 0.0
                    if c >= 0:
                        top = zc[z] + high * span
                        if first[y, x] < 0:
                            first[y, x] = c
                            entry[y, x] = top
                        if met[c, y, x] == np.inf:
                            met[c, y, x] = used[x]
                        cost = (high - low) * span * slowness[c] if slowness[c] < np.inf else np.inf
                        if used[x] + cost > budget:
                            rest = budget - used[x]
                            floor[y, x] = top - (rest / slowness[c] if slowness[c] < np.inf else 0.0)
                            stop[y, x] = c
                            left -= 1
                            break
                        used[x] += cost
                    high = low
            z -= 1
    return floor, entry, stop, first, met


@njit(cache=True, parallel=True)
def through_times(code, row_of, count, start, interval_code, interval_end, zc, slowness, slot, listed):
    """When the beam reaches and leaves each listed film where nothing but listed films lies above it.

    Parameters
    ----------
    slot : (films,) int64, a film's place among the `listed` ones (their number), or -1

    Returns
    -------
    (3, listed, ny, nx) float64
        Time at the film's top, time at its bottom, its thickness (um), without what lies below
        another film; inf, inf and 0 where the film is not met.
    """
    nz, ny, nx = code.shape
    out = np.full((3, listed, ny, nx), np.inf)
    for y in prange(ny):
        out[2, :, y, :] = 0.0
        used = np.zeros(nx)
        inside = np.full(nx, -1)  # the listed film that the beam was in last
        alive = np.ones(nx, np.bool_)
        left = nx
        z = nz - 2
        while z >= 0 and left > 0:
            span = zc[z + 1] - zc[z]
            for x in range(nx):
                if not alive[x]:
                    continue
                s = row_of[(z * ny + y) * nx + x]
                n = np.int64(count[s, 2]) if s >= 0 else 0
                high = 1.0
                for q in range(max(n, 1) - 1, -1, -1):
                    if n > 0:
                        c = interval_code[start[s * 7 + 2] + q]
                        low = interval_end[start[s * 7 + 2] + q - 1] if q > 0 else 0.0
                    else:
                        c = code[z, y, x]
                        low = 0.0
                    if c >= 0:
                        k = slot[c]
                        if k < 0:
                            alive[x] = False
                            left -= 1
                            break
                        length = (high - low) * span
                        fresh = out[0, k, y, x] == np.inf
                        if fresh:
                            out[0, k, y, x] = used[x]
                        used[x] += length * slowness[c]
                        if fresh or inside[x] == k:
                            out[1, k, y, x] = used[x]
                            out[2, k, y, x] += length
                        inside[x] = k
                    high = low
            z -= 1
    return out


@njit(cache=True, parallel=True)
def column_thickness(code, row_of, count, start, interval_code, interval_end, zc, films):
    """Length of every film in every column, `(films, ny, nx)` float64 um."""
    nz, ny, nx = code.shape
    out = np.zeros((films, ny, nx))
    for y in prange(ny):
        for z in range(nz - 1):
            span = zc[z + 1] - zc[z]
            for x in range(nx):
                s = row_of[(z * ny + y) * nx + x]
                n = np.int64(count[s, 2]) if s >= 0 else 0
                if n == 0:
                    c = code[z, y, x]
                    if c >= 0:
                        out[c, y, x] += span
                    continue
                at = start[s * 7 + 2]
                low = 0.0
                for q in range(n):
                    c = interval_code[at + q]
                    if c >= 0:
                        out[c, y, x] += (interval_end[at + q] - low) * span
                    low = interval_end[at + q]
    return out


@njit(cache=True)
def _among(keys, key):
    low = np.searchsorted(keys, key)
    return low < keys.size and keys[low] == key


@njit(cache=True)
def piece_length(code, row_of, count, start, interval_code, interval_end, zc, film, piece, pieces):
    """Length in all columns of `film`'s listed pieces, and of all of the film, um."""
    nz, ny, nx = code.shape
    n = code.size
    flat = code.reshape(-1)
    mine = 0.0
    whole = 0.0
    for z in range(nz - 1):
        span = zc[z + 1] - zc[z]
        for y in range(ny):
            for x in range(nx):
                i = (z * ny + y) * nx + x
                s = row_of[i]
                m = count[s, 2] if s >= 0 else 0
                if m == 0:
                    if flat[i] == film:
                        whole += span
                        if _among(pieces, piece[i]):
                            mine += span
                    continue
                at = start[s * 7 + 2]
                low = 0.0
                for q in range(m):
                    if interval_code[at + q] == film:
                        node = i if q == 0 else (i + ny * nx if q == m - 1 else n + at + q)
                        length = (interval_end[at + q] - low) * span
                        whole += length
                        if _among(pieces, piece[node]):
                            mine += length
                    low = interval_end[at + q]
    return mine, whole


@njit(cache=True)
def touching_area(samples, code, strides, shape, count, start, interval_code, piece, pieces, zc, cell, doubled):
    """Area of the faces between the listed pieces and other solids, um2.

    A contact on a vertical edge stands for one cell's area, on a level edge for one cell's side.
    """
    nz, ny, nx = shape
    n = code.size
    area = 0.0
    for s in range(samples.size):
        i = samples[s]
        z = i // (ny * nx)
        for d in range(3):
            m = np.int64(count[s, d])
            at = start[s * 7 + d]
            j = i + strides[d]
            for q in range(m - 1):
                if interval_code[at + q] < 0 or interval_code[at + q + 1] < 0:
                    continue
                a = piece[i] if q == 0 else piece[n + at + q]
                b = piece[j] if q + 1 == m - 1 else piece[n + at + q + 1]
                if _among(pieces, a) != _among(pieces, b):
                    if d == 2:
                        area += cell * cell
                    else:
                        area += cell * 0.5 * (zc[min(z + 1, nz - 1)] - zc[max(z - 1, 0)])
    return area * 0.5 if doubled else area
