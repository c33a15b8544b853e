"""A directional etch: every column of cells is struck from above on its own.

Times are spent along the columns' edges, whose intervals (see `kernels.regions`) are exact to a
small fraction of a cell; direction 2 of a sample's edges leads upward.
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
    """
    nz, ny, nx = code.shape
    floor = np.full((ny, nx), zc[0])
    entry = np.full((ny, nx), zc[0])
    stop = np.full((ny, nx), -1, np.int32)
    first = np.full((ny, nx), -1, np.int32)
    for y in prange(ny):
        for x in range(nx):
            used = 0.0
            alive = True
            for z in range(nz - 2, -1, -1):
                i = (z * ny + y) * nx + x
                s = row_of[i]
                n = count[s, 2] if s >= 0 else 0
                high = 1.0
                for q in range(max(n, 1) - 1, -1, -1):
                    if n > 0:
                        c = interval_code[start[s * 7 + 2] + q]
                        low = interval_end[start[s * 7 + 2] + q - 1] if q > 0 else 0.0
                    else:
                        c = code[z, y, x]
                        low = 0.0
                    if c >= 0:
                        span = zc[z + 1] - zc[z]
                        top = zc[z] + high * span
                        if first[y, x] < 0:
                            first[y, x] = c
                            entry[y, x] = top
                        cost = (high - low) * span * slowness[c] if slowness[c] < np.inf else np.inf
                        if used + cost > budget:
                            left = budget - used
                            floor[y, x] = top - (left / slowness[c] if slowness[c] < np.inf else 0.0)
                            stop[y, x] = c
                            alive = False
                            break
                        used += cost
                    high = low
                if not alive:
                    break
    return floor, entry, stop, first


@njit(cache=True, parallel=True)
def through_times(code, row_of, count, start, interval_code, interval_end, zc, slowness, film, passing):
    """When the beam reaches and leaves `film` in columns where nothing but `passing` lies above it.

    Returns `(3, ny, nx)` float64: time at its top, time at its bottom, its thickness (um); inf, inf
    and 0 where the film is not met.
    """
    nz, ny, nx = code.shape
    out = np.full((3, ny, nx), np.inf)
    for y in prange(ny):
        for x in range(nx):
            used = 0.0
            thick = 0.0
            seen = False
            done = False
            for z in range(nz - 2, -1, -1):
                i = (z * ny + y) * nx + x
                s = row_of[i]
                n = count[s, 2] if s >= 0 else 0
                high = 1.0
                for q in range(max(n, 1) - 1, -1, -1):
                    if n > 0:
                        c = interval_code[start[s * 7 + 2] + q]
                        low = interval_end[start[s * 7 + 2] + q - 1] if q > 0 else 0.0
                    else:
                        c = code[z, y, x]
                        low = 0.0
                    if c >= 0:
                        length = (high - low) * (zc[z + 1] - zc[z])
                        if c == film:
                            if not seen:
                                out[0, y, x] = used
                                seen = True
                            used += length * slowness[c]
                            thick += length
                            out[1, y, x] = used
                        elif seen or passing[c] == 0:
                            done = True
                            break
                        else:
                            used += length * slowness[c]
                    high = low
                if done:
                    break
            out[2, y, x] = thick
    return out


@njit(cache=True)
def _slab_share(ta, tb, fa, fb, has_floor):
    """Middle of the part of an edge where a film was laid, or -1; from its top and floor at the ends."""
    low, high = 0.0, 1.0
    if ta >= 0 and tb >= 0:
        return -1.0
    if tb >= 0:
        high = ta / (ta - tb)
    elif ta >= 0:
        low = ta / (ta - tb)
    if has_floor:
        if fa < 0 and fb < 0:
            return -1.0
        if fa < 0:
            low = max(low, fa / (fa - fb))
        elif fb < 0:
            high = min(high, fa / (fa - fb))
    return 0.5 * (low + high) if high > low + 1e-3 else -1.0


@njit(cache=True, parallel=True)
def shadow(top, floor, gone, has_floor, zc, row_of, count, start, interval_code, interval_end, film):
    """Planar distance to the edges of a mask seen from `film` below it, `(nz, ny, nx)` float32.

    At each sample the least value, over the heights above, of the mask's gone field where the mask
    was laid: positive in its openings, negative under it, inf where none of it lies above. On an
    edge that holds the film, only what lies above the film counts for the sample below it.
    """
    nz, ny, nx = top.shape
    out = np.full((nz, ny, nx), np.inf, np.float32)
    for y in prange(ny):
        for x in range(nx):
            least = np.inf
            for z in range(nz - 1, -1, -1):
                late = np.inf
                below_film = False
                if z < nz - 1:
                    s = row_of[(z * ny + y) * nx + x]
                    n = count[s, 2] if s >= 0 else 0
                    film_low = -1.0
                    for q in range(n):
                        at = start[s * 7 + 2] + q
                        if interval_code[at] == film:
                            film_low = interval_end[at - 1] if q > 0 else 0.0
                            below_film = q > 0
                            break
                    mid = _slab_share(top[z, y, x], top[z + 1, y, x], floor[z, y, x], floor[z + 1, y, x], has_floor)
                    if mid >= 0:
                        g = gone[z, y, x] + mid * (gone[z + 1, y, x] - gone[z, y, x])
                        if mid > film_low:
                            least = min(least, g)
                        else:
                            late = g
                if top[z, y, x] < 0 and (not has_floor or floor[z, y, x] >= 0):
                    if below_film:
                        late = min(late, gone[z, y, x])
                    else:
                        least = min(least, gone[z, y, x])
                out[z, y, x] = least
                least = min(least, late)
    return out


@njit(cache=True)
def beside_film(samples, code, count, start, interval_code, strides, film, first, last):
    """Mark the samples that are not in `film` but have it on an edge of directions first..last-1, `(n,)` bool."""
    out = np.zeros(code.size, np.bool_)
    for s in range(samples.size):
        for d in range(first, last):
            at = start[s * 7 + d]
            for q in range(np.int64(count[s, d])):
                if interval_code[at + q] == film:
                    for i in (samples[s], samples[s] + strides[d]):
                        if code[i] != film:
                            out[i] = True
    return out


@njit(cache=True, parallel=True)
def moved_down(top, depth, zc):
    """A film's top field moved down by `depth (ny, nx)` um, seen from above, `(nz, ny, nx)` float32.

    Seen from above: under an overhang the field of the overhang counts.
    """
    nz, ny, nx = top.shape
    out = np.empty((nz, ny, nx), np.float32)
    for y in prange(ny):
        for x in range(nx):
            seen = np.empty(nz, np.float64)
            least = np.inf
            for z in range(nz - 1, -1, -1):
                least = min(least, top[z, y, x])
                seen[z] = least
            for z in range(nz):
                at = zc[z] + depth[y, x]
                k = min(np.searchsorted(zc, at), nz - 1)
                if at >= zc[nz - 1]:
                    out[z, y, x] = seen[nz - 1] + (at - zc[nz - 1])
                elif k == 0 or depth[y, x] == 0:
                    out[z, y, x] = seen[z]
                else:
                    s = (at - zc[k - 1]) / (zc[k] - zc[k - 1])
                    out[z, y, x] = seen[k - 1] + s * (seen[k] - seen[k - 1])
    return out


@njit(cache=True, parallel=True)
def column_thickness(code, row_of, count, start, interval_code, interval_end, zc, film):
    """Length of `film` in every column, `(ny, nx)` float64 um."""
    nz, ny, nx = code.shape
    out = np.zeros((ny, nx))
    for y in prange(ny):
        for x in range(nx):
            total = 0.0
            for z in range(nz - 1):
                i = (z * ny + y) * nx + x
                s = row_of[i]
                n = count[s, 2] if s >= 0 else 0
                span = zc[z + 1] - zc[z]
                if n == 0:
                    if code[z, y, x] == film:
                        total += span
                    continue
                at = start[s * 7 + 2]
                low = 0.0
                for q in range(n):
                    if interval_code[at + q] == film:
                        total += (interval_end[at + q] - low) * span
                    low = interval_end[at + q]
            out[y, x] = total
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
