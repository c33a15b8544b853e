"""What a beam takes from one film, at the samples in it and beside it: shadows of masks, the etched floor, the wall.

All work is done in a box of the samples: planes from `low` up, rows from `y0` and columns from `x0`
on; arrays over the box are `(bz, by, bx)`. A thread works on rows of columns, plane after plane.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

BESIDE = 1  # a void sample that has the film on a level edge alone
FLANK = 2  # the same of a sample in another solid
HELD = 3  # a sample in the film, or with it on its upright edges


@njit(cache=True, parallel=True)
def mark_film(samples, plane_start, code, count, start, interval_code, film, low):
    """What every sample from plane `low` up is to `film`, `(nz - low, ny, nx)` uint8: 0 or one of the above.

    `plane_start (nz + 1,)` says where in `samples` (sorted) each plane begins.
    """
    nz, ny, nx = code.shape
    out = np.zeros((nz - low, ny, nx), np.uint8)
    for plane in prange(nz - low):
        z = np.int64(plane) + low
        own = code[z].reshape(-1)
        mark = out[plane].reshape(-1)
        for i in range(own.size):
            if own[i] == film:
                mark[i] = HELD
        for s in range(plane_start[z], plane_start[z + 1]):
            i = samples[s] - z * ny * nx
            for d in range(3):
                n = np.int64(count[s, d])
                at = start[s * 7 + d]
                here = False
                for q in range(n):
                    here |= interval_code[at + q] == film
                if not here:
                    continue
                if d == 2:
                    mark[i] = HELD
                    continue
                j = i + (1 if d == 0 else nx)
                if mark[i] == 0:
                    mark[i] = FLANK if own[i] >= 0 else BESIDE
                if mark[j] == 0:
                    mark[j] = FLANK if own[j] >= 0 else BESIDE
        if z == 0:
            continue
        for s in range(plane_start[z - 1], plane_start[z]):
            at = start[s * 7 + 2]
            for q in range(np.int64(count[s, 2])):
                if interval_code[at + q] == film:
                    mark[samples[s] - (z - 1) * ny * nx] = HELD
    return out


@njit(cache=True, parallel=True)
def passed_columns(mark, floor, zc, low):
    """Columns with a marked sample that the beam, which is at `floor (ny, nx)` um, has passed, `(ny, nx)` bool."""
    bz, ny, nx = mark.shape
    out = np.zeros((ny, nx), np.bool_)
    for y in prange(ny):
        for z in range(bz):
            for x in range(nx):
                out[y, x] |= mark[z, y, x] > 0 and zc[z + low] >= floor[y, x]
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


@njit(cache=True)
def _film_foot(s, count, start, interval_code, interval_end, film):
    """Foot of the film on the upright edge of row s, share of the edge (-1 for none); whether it lies on another."""
    if s >= 0:
        at = start[s * 7 + 2]
        for q in range(np.int64(count[s, 2])):
            if interval_code[at + q] == film:
                return (np.float64(interval_end[at + q - 1]) if q > 0 else 0.0), q > 0
    return -1.0, False


@njit(cache=True, parallel=True)
def shadow(side, top, floor, gone, has_floor, row_of, count, start, interval_code, interval_end, film, low, y0, x0):
    """Lower `side (bz, by, bx)` float32 to the planar distance to the edges of a mask seen from `film` below it, um.

    At each sample the least value, over the heights above, of the mask's gone field where the mask
    was laid: positive in its openings, negative under it, inf where none of it lies above. On an
    edge that holds the film, only what lies above the film counts for the sample below it.
    """
    nz, ny, nx = top.shape
    bz, by, bx = side.shape
    for b in prange(by):
        y = np.int64(b) + y0
        least = np.full(bx, np.inf)
        for z in range(nz - 1, low - 1, -1):
            for a in range(bx):
                x = a + x0
                here, above = top[z, y, x], top[min(z + 1, nz - 1), y, x]
                under, over = floor[z, y, x], floor[min(z + 1, nz - 1), y, x]
                late = np.inf
                if (here < 0 or above < 0) and (not has_floor or under >= 0 or over >= 0):
                    inside = here < 0 and (not has_floor or under >= 0)
                    mid = _slab_share(here, above, under, over, has_floor) if z < nz - 1 else -1.0
                    if inside or mid >= 0:
                        s = row_of[(z * ny + y) * nx + x] if z < nz - 1 else -1
                        foot, raised = _film_foot(s, count, start, interval_code, interval_end, film)
                        value = gone[z, y, x]
                        if mid >= 0:
                            g = value + mid * (gone[z + 1, y, x] - value)
                            if mid > foot:
                                least[a] = min(least[a], g)
                            else:
                                late = g
                        if inside and raised:
                            late = min(late, value)
                        elif inside:
                            least[a] = min(least[a], value)
                if z - low < bz and least[a] < side[z - low, b, a]:
                    side[z - low, b, a] = least[a]
                least[a] = min(least[a], late)


@njit(cache=True)
def _at_height(seen, zc, z, x, depth):
    """Value of a column of `seen (nz, bx)` a `depth` above sample z, um; above the last sample it grows with height."""
    last = zc.size - 1
    at = zc[z] + depth
    if at >= zc[last]:
        return np.float32(seen[last, x] + (at - zc[last]))
    k = z
    while k < last and zc[k] < at:
        k += 1
    if k == 0 or depth == 0:
        return seen[z, x]
    share = (at - zc[k - 1]) / (zc[k] - zc[k - 1])
    return np.float32(np.float64(seen[k - 1, x]) + share * (np.float64(seen[k, x]) - np.float64(seen[k - 1, x])))


@njit(cache=True, parallel=True)
def moved_down(mark, top, gone, has_gone, depth, lateral, shielded, zc, low, y0, x0):
    """A film's top, less what is gone of it, moved down by `depth (by, bx)` um, `(bz, by, bx)` float32.

    Seen from above: under an overhang the field of the overhang counts. Samples without a `mark
    (bz, by, bx)` are left at 0. In the columns `shielded (by, bx)` from the beam, what is clear of the
    walls, `lateral (bz, by, bx)` above 0, does not move.
    """
    nz = top.shape[0]
    bz, by, bx = mark.shape
    out = np.zeros((bz, by, bx), np.float32)
    for b in prange(by):
        y = np.int64(b) + y0
        seen = np.empty((nz, bx), np.float32)
        for z in range(nz - 1, low - 1, -1):
            for a in range(bx):
                value = top[z, y, a + x0]
                if has_gone:
                    value = max(value, gone[z, y, a + x0])
                seen[z, a] = value if z == nz - 1 else min(value, seen[z + 1, a])
        for z in range(bz):
            for a in range(bx):
                if mark[z, b, a] > 0:
                    still = shielded[b, a] and lateral[z, b, a] > 0
                    out[z, b, a] = _at_height(seen, zc, z + low, a, 0.0 if still else depth[b, a])
    return out


@njit(cache=True)
def _from_wall(side, reached, open_column, leaning, behind, tangent, sine, cell):
    """Distance of a sample from the walls that the masks above it leave, um, positive in the opening.

    `behind` is how far the sample lies below the beam's entry and `tangent` that of the wall's angle.
    """
    out = np.float64(side)
    if out == np.inf and not reached and not open_column:
        out = -0.5 * cell
    if leaning:
        return (out - behind / tangent) * sine
    return np.inf if reached and out < 0 else out  # the mask above is gone there


@njit(cache=True, parallel=True)
def wall_distance(mark, side, floor, entry, open_column, leaning, tangent, sine, zc, low, cell):
    """Distance from the walls left by the masks at every marked sample, `(bz, by, bx)` float64 um.

    `floor`, `entry` and `open_column (by, bx)` are the beam's end, where it came in, and whether it
    passed a marked sample.
    """
    bz, by, bx = mark.shape
    out = np.zeros((bz, by, bx))
    for b in prange(by):
        for z in range(bz):
            height = zc[z + low]
            for a in range(bx):
                if mark[z, b, a] > 0:
                    out[z, b, a] = _from_wall(
                        side[z, b, a], height >= floor[b, a], open_column[b, a], leaning, entry[b, a] - height,
                        tangent, sine, cell,
                    )  # fmt: skip
    return out


@njit(cache=True)
def _mean_beside(value, mark, z, y, x):
    """Mean of the marked samples around one that do not flank the film, those along an axis first, then across a face.

    inf where there is none.
    """
    bz, by, bx = value.shape
    best = 4
    total = 0.0
    n = 0
    for c in range(max(z - 1, 0), min(z + 2, bz)):
        for b in range(max(y - 1, 0), min(y + 2, by)):
            for a in range(max(x - 1, 0), min(x + 2, bx)):
                k = abs(c - z) + abs(b - y) + abs(a - x)
                if k == 0 or k > best or mark[c, b, a] == 0 or mark[c, b, a] == FLANK:
                    continue
                if k < best:
                    best = k
                    total = 0.0
                    n = 0
                total += np.float32(min(value[c, b, a], 1e6))
                n += 1
    return np.float64(np.float32(total / n)) if n > 0 else np.inf


@njit(cache=True, parallel=True)
def removed_values(mark, below, lateral, cut, shielded, band):
    """Removed field of a film at its marked samples, `(bz, by, bx)` float32 um, within the band; 0 elsewhere.

    Parameters
    ----------
    below : (bz, by, bx) float32, um; height above the etched floor
    lateral : (bz, by, bx) float64, um; distance from the wall
    cut : (by, bx) bool; columns in which the film is cut through
    shielded : (by, bx) bool; columns of the film that the beam did not get to: what is clear of the walls is not cut

    A sample that flanks the film takes its distance from the wall from its neighbours: it lies, in
    the step that the film covers, in what would shadow it.
    """
    bz, by, bx = mark.shape
    out = np.zeros((bz, by, bx), np.float32)
    for b in prange(by):
        for z in range(bz):
            for a in range(bx):
                if mark[z, b, a] == 0:
                    continue
                wall = lateral[z, b, a]
                through = cut[b, a] and not (shielded[b, a] and wall > 0)
                if mark[z, b, a] == FLANK:
                    wall = _mean_beside(lateral, mark, z, np.int64(b), a)
                down = np.float64(np.float32(band) if through else below[z, b, a])
                value = -np.hypot(down, wall) if down < 0 and wall < 0 else min(down, wall)
                out[z, b, a] = min(max(value, -band), band)
    return out
