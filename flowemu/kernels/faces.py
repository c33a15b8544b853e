"""Bare faces of films: the triangles of their surfaces that an etchant comes from.

The grid's cells are cut into tetrahedra (see `kernels.regions`) on which every field is linear, so a
film's surface there is a flat piece; where another film covers part of it, it is halved until the bare
part is told to an eighth of a cell.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

TETRAHEDRA = np.array(
    [(0, 1, 3, 7), (0, 1, 5, 7), (0, 2, 3, 7), (0, 2, 6, 7), (0, 4, 5, 7), (0, 4, 6, 7)], dtype=np.int64
)
NUDGE = 0.01  # how far, as a share of a cell, either side of a face is looked at
DEPTH = 3  # times a face is halved where it is partly covered
STACK = 32


@njit(cache=True)
def _code_of(values, ti, bi, gi):
    roof = 0
    for k in range(ti.size):
        if values[ti[k]] < 0:
            if bi[k] < 0 or values[bi[k]] >= 0:
                if gi[k] < 0 or values[gi[k]] < 0:
                    return k
                roof = 0
            elif roof == 0:
                roof = k
    return -1 - roof


@njit(cache=True)
def _face(f, vals, points, out_points, out_values):
    """Corners (at most 4) of the surface of field f in a tetrahedron, in order round it."""
    m = 0
    odd = False
    for a in range(4):
        if vals[a, f] >= 0:
            continue
        for k in range(4):
            b = 3 - k if odd else k
            if vals[b, f] < 0:
                continue
            s = vals[a, f] / (vals[a, f] - vals[b, f])
            for g in range(vals.shape[1]):
                out_values[m, g] = vals[a, g] + s * (vals[b, g] - vals[a, g])
            for g in range(3):
                out_points[m, g] = points[a, g] + s * (points[b, g] - points[a, g])
            m += 1
        odd = not odd
    return m


@njit(cache=True)
def _classes(v, mean_in, mean_out, ti, bi, gi, work):
    """Codes just inside and just outside a face at a point with field values v."""
    for g in range(v.size):
        work[g] = v[g] + NUDGE * (mean_in[g] - v[g])
    inner = _code_of(work, ti, bi, gi)
    for g in range(v.size):
        work[g] = v[g] + NUDGE * (mean_out[g] - v[g])
    return inner, _code_of(work, ti, bi, gi)


@njit(cache=True)
def _cut_triangle(corner, value, mean_in, mean_out, film, source, ti, bi, gi, scratch, out, n):
    """Append to `out` the bare part of one triangle (rows 0..2); returns (count, some of it is covered).

    `scratch` is (points, values, levels, mixed, work): a stack of triangles still to be looked at.
    """
    points, values, level, mixed, work = scratch
    offset = source.size // 2
    points[0] = corner
    values[0] = value
    level[0] = 0
    left = 1
    covered = False
    while left > 0:
        left -= 1
        q = left
        bare = 0
        first_bare = -1
        for g in range(3):
            for f in range(mixed.size):
                mixed[f] = values[q, g, f] * 0.98 + (values[q, 0, f] + values[q, 1, f] + values[q, 2, f]) * (0.02 / 3)
            inner, outer = _classes(mixed, mean_in, mean_out, ti, bi, gi, work)
            if inner == film and source[outer + offset] != 0:
                bare += 1
                first_bare = g
            elif inner == film:
                covered = True
        for f in range(mixed.size):
            mixed[f] = (values[q, 0, f] + values[q, 1, f] + values[q, 2, f]) / 3
        inner, outer = _classes(mixed, mean_in, mean_out, ti, bi, gi, work)
        middle = inner == film and source[outer + offset] != 0
        if (bare == 3 and middle) or (level[q] == DEPTH and middle):
            if n < out.shape[0]:
                out[n] = points[q]
                n += 1
        elif level[q] == DEPTH:
            if bare > 0 and n < out.shape[0]:  # too small to cut further: a bare corner stands for it
                out[n, 0] = points[q, first_bare]
                out[n, 1] = points[q, first_bare]
                out[n, 2] = points[q, first_bare]
                n += 1
        elif bare > 0 or middle:
            a = points[q].copy()
            b = values[q].copy()
            deeper = level[q] + 1
            for k in range(4):
                for g in range(3):
                    h = (g + 1) % 3
                    for i in range(3):
                        points[left, g, i] = 0.5 * (a[g, i] + a[h, i]) if k == 3 else 0.5 * (a[k, i] + a[g, i])
                    for i in range(b.shape[1]):
                        values[left, g, i] = 0.5 * (b[g, i] + b[h, i]) if k == 3 else 0.5 * (b[k, i] + b[g, i])
                level[left] = deeper
                left += 1
    return n, covered


@njit(cache=True)
def _tetra_triangles(vals, points, f, film, on_floor, plain, source, ti, bi, gi, face, scratch, out, n):
    """Append the bare triangles of field f's surface in a tetrahedron; see `_cut_triangle`."""
    corner, value, mean_in, mean_out, tri_p, tri_v = face
    m = _face(f, vals, points, corner, value)
    if m < 3:
        return n, False
    if plain:
        for t in range(m - 2):
            if n < out.shape[0]:
                out[n, 0] = corner[0]
                out[n, 1] = corner[t + 1]
                out[n, 2] = corner[t + 2]
                n += 1
        return n, False
    below = 0
    mean_in[:] = 0
    mean_out[:] = 0
    for a in range(4):
        if (vals[a, f] < 0) != on_floor:
            mean_in += vals[a]
            below += 1
        else:
            mean_out += vals[a]
    mean_in /= below
    mean_out /= 4 - below
    covered = False
    for t in range(m - 2):
        for g in range(3):
            q = 0 if g == 0 else t + g
            tri_p[g] = corner[q]
            tri_v[g] = value[q]
        n, more = _cut_triangle(tri_p, tri_v, mean_in, mean_out, film, source, ti, bi, gi, scratch, out, n)
        covered |= more
    return n, covered


@njit(cache=True)
def _open_codes(base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, is_open, piece, mark):
    """Mark in `mark` (by code + half its size) the codes of the open voids that reach into a cell."""
    n = code.size
    offset = mark.size // 2
    found = False
    for a in range(8):
        i = base + corner_offsets[a]
        if code[i] < 0 and is_open[piece[i]] != 0:
            mark[code[i] + offset] = 1
            found = True
        s = row_of[i]
        for b in range(a + 1, 8):
            if (a & b) == a:
                d = step_of_bits[b - a]
                at = start[s * 7 + d]
                for q in range(1, np.int64(count[s, d]) - 1):
                    c = interval_code[at + q]
                    if c < 0 and is_open[piece[n + at + q]] != 0:
                        mark[c + offset] = 1
                        found = True
    return found


@njit(cache=True)
def _present(base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, present):
    """Mark in `present` the films that reach into a cell (as corner or inside an edge)."""
    present[:] = 0
    for a in range(8):
        i = base + corner_offsets[a]
        if code[i] >= 0:
            present[code[i]] = 1
        s = row_of[i]
        for b in range(a + 1, 8):
            if (a & b) == a:
                d = step_of_bits[b - a]
                at = start[s * 7 + d]
                for q in range(1, np.int64(count[s, d]) - 1):
                    if interval_code[at + q] >= 0:
                        present[interval_code[at + q]] = 1


@njit(cache=True, parallel=True)
def bare_triangles(
    cells, corner_offsets, step_of_bits, shape, row_of, values, code, count, start, interval_code, ti, bi, gi,
    stage, source, is_open, piece, zc, dx, dy, first, triangles, films_of,
):  # fmt: skip
    """The bare triangles of staged films in every mixed cell.

    The etchant comes from the films that `source` marks (by code + half its size); where none is
    marked, from the voids whose roots `is_open` marks. With `triangles` empty only their numbers are
    counted; else they are written, cell after cell from `first`, with their films.

    Returns
    -------
    number : (cells,) int32
    partly : (cells,) uint8, where a face of a film ends under a cover
    """
    _, ny, nx = shape
    films = stage.size
    nf = values.shape[1]
    number = np.zeros(cells.size, np.int32)
    partly = np.zeros(cells.size, np.uint8)
    fill = triangles.shape[0] > 0
    from_void = not source.any()
    for c in prange(cells.size):
        if fill and first[c + 1] == first[c]:
            continue
        base = cells[c]
        here = source.copy()
        if from_void:
            if not _open_codes(
                base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, is_open, piece, here
            ):
                continue
        present = np.empty(films, np.int64)
        _present(base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, present)
        changing = 0
        for f in range(nf):
            below = 0
            for a in range(8):
                below += values[row_of[base + corner_offsets[a]], f] < 0
            changing += 0 < below < 8
        vals = np.empty((4, nf), np.float64)
        points = np.empty((4, 3), np.float64)
        face = (
            np.empty((4, 3)), np.empty((4, nf)), np.empty(nf), np.empty(nf), np.empty((3, 3)), np.empty((3, nf)),
        )  # fmt: skip
        scratch = (
            np.empty((STACK, 3, 3)), np.empty((STACK, 3, nf)), np.empty(STACK, np.int64), np.empty(nf), np.empty(nf),
        )  # fmt: skip
        found = np.empty((400, 3, 3), np.float64)
        n = 0
        bz = base // (ny * nx)
        by = (base // nx) % ny
        bx = base % nx
        for film in range(films):
            if present[film] == 0 or stage[film] == 0:
                continue
            before = n
            for t in range(6):
                for a in range(4):
                    o = TETRAHEDRA[t, a]
                    vals[a] = values[row_of[base + corner_offsets[o]]]
                    points[a, 0] = (bx + (o & 1)) * dx
                    points[a, 1] = (by + ((o >> 1) & 1)) * dy
                    points[a, 2] = zc[bz + (o >> 2)]
                for side in range(3):
                    f = ti[film] if side == 0 else (bi[film] if side == 1 else gi[film])
                    if f < 0:
                        continue
                    n, covered = _tetra_triangles(
                        vals, points, f, film, side == 1, changing == 1, here, ti, bi, gi, face, scratch, found, n
                    )
                    if covered:
                        partly[c] = 1
            if fill:
                for q in range(before, n):
                    films_of[first[c] + q] = film
        number[c] = n
        if fill:
            for q in range(n):
                triangles[first[c] + q] = found[q]
        if n == 0:
            partly[c] = 0
    return number, partly
