"""Where films lie bare to an etchant: triangles of their surfaces, cell by cell.

A face is part of the surface of one field inside a tetrahedron of a mixed cell (see `kernels.regions`). It is cut along
the surfaces of the other fields, so that each piece is bare or covered as a whole. Threads call the compiled loop,
which lets go of the interpreter's lock, on runs of cells: as a parallel kernel it takes twice as long to compile.

`cut` lists the fields that change sign inside a cell, `negative (fields,)` the signs of all others there. `source`,
`(2 w + 1,)` uint8, is 1 at `code + w` for the codes that the etchant comes from.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
from numba import get_num_threads, njit

from flowemu.kernels.regions import STEP_OF_BITS, TETRAHEDRA

NUDGE = 0.01  # how far, as a share of a cell, either side of a face is looked at
THIN = 1e-3  # of a cell: two surfaces that lie closer than this are one
PIECES = 24  # that a face may be cut into
CORNERS = 16  # of one piece
MOST = 600  # triangles of one film in one cell
RUN = 4096  # cells that a thread takes at a time


@njit(cache=True)
def _open_codes(base, corner_offsets, row_of, code, count, start, interval_code, is_open, piece, mark):
    """Mark in `mark` (by code + half its size) the codes of the open voids in a cell; whether there is any."""
    n = code.size
    offset = mark.size // 2
    mark[:] = 0
    found = False
    for a in range(8):
        i = base + corner_offsets[a]
        if code[i] < 0 and is_open[piece[i]] != 0:
            mark[code[i] + offset] = 1
            found = True
        s = row_of[i]
        for b in range(a + 1, 8):
            if (a & b) == a:
                d = STEP_OF_BITS[b - a]
                at = start[s * 7 + d]
                for q in range(1, np.int64(count[s, d]) - 1):
                    c = interval_code[at + q]
                    if c < 0 and is_open[piece[n + at + q]] != 0:
                        mark[c + offset] = 1
                        found = True
    return found


@njit(cache=True)
def _cell_values(base, corner_offsets, row_of, values, negative, cut, corner_values):
    """Gather the values at a cell's corners, `(8, fields)`; returns the number of fields listed in `cut`."""
    nc = 0
    for f in range(values.shape[1]):
        below = 0
        for a in range(8):
            v = values[row_of[base + corner_offsets[a]], f]
            corner_values[a, nc] = v
            below += v < 0
        negative[f] = below == 8
        if 0 < below < 8:
            cut[nc] = f
            nc += 1
    return nc


@njit(cache=True)
def _code_here(negative, ti, bi, gi):
    """The code of a point from the signs of its fields; see `regions.code_of`."""
    roof = 0
    for k in range(ti.size):
        if negative[ti[k]]:
            if bi[k] < 0 or not negative[bi[k]]:
                if gi[k] < 0 or negative[gi[k]]:
                    return k
                roof = 0
            elif roof == 0:
                roof = k
    return -1 - roof


@njit(cache=True)
def _code_beside(value, mean, cut, nc, negative, ti, bi, gi):
    """Code a little way from a point of a face towards `mean`."""
    for c in range(nc):
        negative[cut[c]] = value[c] + NUDGE * (mean[c] - value[c]) < 0
    return _code_here(negative, ti, bi, gi)


@njit(cache=True)
def _face(c, vals, points, nc, corner, value):
    """Corners (at most 4) of the surface of the cell's cut field c in a tetrahedron, in order round it."""
    m = 0
    inside = 0
    for p in range(4):
        if vals[p, c] >= 0:
            continue
        for q0 in range(4):
            q = q0 if inside % 2 == 0 else 3 - q0
            if vals[q, c] < 0:
                continue
            s = vals[p, c] / (vals[p, c] - vals[q, c])
            for g in range(nc):
                value[m, g] = vals[p, g] + s * (vals[q, g] - vals[p, g])
            for g in range(3):
                corner[m, g] = points[p, g] + s * (points[q, g] - points[p, g])
            m += 1
        inside += 1
    return m


@njit(cache=True)
def _means(c, vals, nc, swapped, mean_in, mean_out):
    """Mean values at the corners within and beyond a face; swapped where the film is on its positive side."""
    n_in = 0
    for a in range(4):
        n_in += vals[a, c] < 0
    for g in range(nc):
        total_in = 0.0
        total_out = 0.0
        for a in range(4):
            if vals[a, c] < 0:
                total_in += vals[a, g]
            else:
                total_out += vals[a, g]
        total_in /= n_in
        total_out /= 4 - n_in
        mean_in[g] = total_out if swapped else total_in
        mean_out[g] = total_in if swapped else total_out


@njit(cache=True)
def _one_sided(m, value, mean_in, mean_out, nc):
    """Whether every field has one sign just within the whole face and one just beyond it."""
    for g in range(nc):
        a = value[0, g] + NUDGE * (mean_in[g] - value[0, g]) < 0
        b = value[0, g] + NUDGE * (mean_out[g] - value[0, g]) < 0
        for k in range(1, m):
            if (value[k, g] + NUDGE * (mean_in[g] - value[k, g]) < 0) != a:
                return False
            if (value[k, g] + NUDGE * (mean_out[g] - value[k, g]) < 0) != b:
                return False
    return True


@njit(cache=True)
def _bare(value, mean_in, mean_out, film, source, cut, nc, negative, ti, bi, gi):
    """2 if `film` lies bare to the source at a point of its face, 1 if it is covered there, 0 if it is not there.

    With it the code beyond the face.
    """
    if _code_beside(value, mean_in, cut, nc, negative, ti, bi, gi) != film:
        return 0, 0
    outer = _code_beside(value, mean_out, cut, nc, negative, ti, bi, gi)
    return (2 if source[outer + source.size // 2] != 0 else 1), outer


@njit(cache=True)
def _add_triangle(tri, outer_of, n, points, a, b, c, outer):
    """Add the triangle of three of the points, if there is room; returns the number of triangles."""
    if n == tri.shape[0]:
        return n
    outer_of[n] = outer
    for g in range(3):
        tri[n, 0, g] = points[a, g]
        tri[n, 1, g] = points[b, g]
        tri[n, 2, g] = points[c, g]
    return n + 1


@njit(cache=True)
def _split(poly, size, k, new, g):
    """Split convex polygon k where its column g is zero: the negative side stays, the other becomes polygon `new`."""
    n = size[k]
    for i in range(n):
        for h in range(poly.shape[2]):
            poly[-1, i, h] = poly[k, i, h]
    size[k] = 0
    size[new] = 0
    for i in range(n):
        j = i + 1 if i + 1 < n else 0
        a, b = poly[-1, i, g], poly[-1, j, g]
        side = k if a < 0 else new
        for h in range(poly.shape[2]):
            poly[side, size[side], h] = poly[-1, i, h]
        size[side] += 1
        if (a < 0) != (b < 0):
            s = a / (a - b)
            for h in range(poly.shape[2]):
                v = poly[-1, i, h] + s * (poly[-1, j, h] - poly[-1, i, h])
                poly[k, size[k], h] = v
                poly[new, size[new], h] = v
            size[k] += 1
            size[new] += 1


@njit(cache=True)
def _cut_up(
    c, m, corner, value, mean_in, mean_out, film, source, cut, nc, negative, ti, bi, gi, tri, outer_of, n, thin
):  # fmt: skip
    """Cut a face along the other fields' surfaces and add its bare pieces.

    A piece nowhere deeper than `thin` um beyond a surface is not cut off. Returns the number of triangles, and whether
    some piece is covered.
    """
    poly = np.empty((PIECES + 1, CORNERS, 3 + nc), np.float64)
    size = np.zeros(PIECES + 1, np.int64)
    size[0] = m
    for i in range(m):
        for h in range(3):
            poly[0, i, h] = corner[i, h]
        for h in range(nc):
            poly[0, i, 3 + h] = value[i, h]
    pieces = 1
    for g in range(nc):
        for k in range(pieces):
            low = high = 0.0
            for i in range(size[k]):
                low = min(low, poly[k, i, 3 + g])
                high = max(high, poly[k, i, 3 + g])
            if g != c and low < -thin and high > thin and pieces < PIECES and size[k] < CORNERS - 1:
                _split(poly, size, k, pieces, 3 + g)
                pieces += 1
    w = np.empty(nc, np.float64)
    covered = False
    for k in range(pieces):
        for h in range(nc):
            w[h] = 0.0
            for i in range(size[k]):
                w[h] += poly[k, i, 3 + h] / size[k]
        state, outer = _bare(w, mean_in, mean_out, film, source, cut, nc, negative, ti, bi, gi)
        covered |= state == 1
        if state == 2:
            for i in range(size[k] - 2):
                n = _add_triangle(tri, outer_of, n, poly[k], 0, i + 1, i + 2, outer)
    return n, covered


@njit(cache=True)
def bare_faces(
    c, swapped, vals, points, film, source, cut, nc, negative, ti, bi, gi, tri, outer_of, n, thin, corner, value,
    mean_in, mean_out,
):  # fmt: skip
    """Add to `tri (most, 3, 3)` the triangles of one field's surface in a tetrahedron where `film` is bare.

    `outer_of (most,)` takes the code beyond each.

    Parameters
    ----------
    c : place of the field in `cut`
    swapped : whether the film is on the field's positive side
    vals, points : (4, fields) and (4, 3), values of the fields in `cut`, and places of the corners
    source : (2 w + 1,) uint8; 1 at `code + w` for the codes that the etchant comes from
    negative : (fields,) bool; the signs of the fields that are not cut
    n : number of triangles so far
    thin : um; two surfaces that lie closer than this are one
    corner, value, mean_in, mean_out : (4, 3), (4, fields), (fields,), (fields,) scratch

    Returns
    -------
    n : int
    ends : whether the bare part may end in the face
    """
    m = _face(c, vals, points, nc, corner, value)
    _means(c, vals, nc, swapped, mean_in, mean_out)
    if not _one_sided(m, value, mean_in, mean_out, nc):
        return _cut_up(
            c, m, corner, value, mean_in, mean_out, film, source, cut, nc, negative, ti, bi, gi, tri, outer_of, n, thin
        )
    state, outer = _bare(value[0], mean_in, mean_out, film, source, cut, nc, negative, ti, bi, gi)
    if state == 2:
        for t in range(m - 3, -1, -1):
            n = _add_triangle(tri, outer_of, n, corner, 0, t + 1, t + 2, outer)
    return n, state == 1


@njit(cache=True)
def _place_of(f, cut, nc):
    """Place of a field in `cut`, or -1."""
    for c in range(nc):
        if cut[c] == f:
            return c
    return -1


@njit(cache=True)
def _film_triangles(
    film, bx, by, bz, corner_values, cut, nc, negative, here, ti, bi, gi, zc, dx, dy, tri, outer_of, n, vals, points,
    corner, value, mean_in, mean_out,
):  # fmt: skip
    """Add the bare triangles of one film in a cell; returns their number, and whether its bare surface may end here."""
    partly = False
    faces = (_place_of(ti[film], cut, nc), _place_of(bi[film], cut, nc), _place_of(gi[film], cut, nc))
    if max(faces) < 0:
        return n, partly
    for t in range(6):
        for a in range(4):
            o = TETRAHEDRA[t, a]
            for g in range(nc):
                vals[a, g] = corner_values[o, g]
            points[a, 0] = (bx + (o & 1)) * dx
            points[a, 1] = (by + ((o >> 1) & 1)) * dy
            points[a, 2] = zc[bz + (o >> 2)]
        for face in range(3):
            c = faces[face]
            if c < 0:
                continue
            below = int(vals[0, c] < 0) + int(vals[1, c] < 0) + int(vals[2, c] < 0) + int(vals[3, c] < 0)
            if 0 < below < 4:
                n, ends = bare_faces(
                    c, face == 1, vals, points, film, here, cut, nc, negative, ti, bi, gi, tri, outer_of, n,
                    THIN * dx, corner, value, mean_in, mean_out,
                )  # fmt: skip
                partly |= ends
    return n, partly


@njit(cache=True, nogil=True)
def _triangles_in(
    cells, contents, corner_offsets, shape, row_of, values, code, count, start, interval_code, ti, bi, gi, stage,
    source, is_open, piece, zc, dx, dy,
):  # fmt: skip
    """`bare_triangles` of some cells."""
    _, ny, nx = shape
    films = stage.size
    nf = values.shape[1]
    number = np.zeros(cells.size, np.int32)
    partly = np.zeros(cells.size, np.uint8)
    here = source.copy()
    from_void = not source.any()
    negative = np.empty(nf, np.bool_)
    cut = np.empty(nf, np.int64)
    corner_values = np.empty((8, nf), np.float64)
    vals, value = np.empty((4, nf), np.float64), np.empty((4, nf), np.float64)
    points, corner = np.empty((4, 3), np.float64), np.empty((4, 3), np.float64)
    mean_in, mean_out = np.empty(nf, np.float64), np.empty(nf, np.float64)
    tri = np.empty((4 * MOST, 3, 3), np.float64)
    film_of, outer_of = np.empty(4 * MOST, np.int16), np.empty(4 * MOST, np.int16)
    n = np.int64(0)
    for c in range(cells.size):
        base = cells[c]
        if from_void and not _open_codes(
            base, corner_offsets, row_of, code, count, start, interval_code, is_open, piece, here
        ):
            continue
        nc = -1
        before = n
        for film in range(films):
            if stage[film] == 0 or (contents[c] >> np.uint64(film % 63)) & np.uint64(1) == 0:
                continue
            if nc < 0:
                nc = _cell_values(base, corner_offsets, row_of, values, negative, cut, corner_values)
            if n + MOST > tri.shape[0]:
                tri = np.concatenate((tri, np.empty_like(tri)))
                film_of = np.concatenate((film_of, np.empty_like(film_of)))
                outer_of = np.concatenate((outer_of, np.empty_like(outer_of)))
            bz, by, bx = base // (ny * nx), (base // nx) % ny, base % nx
            first = n
            n, ends = _film_triangles(
                film, bx, by, bz, corner_values, cut, nc, negative, here, ti, bi, gi, zc, dx, dy, tri, outer_of, n,
                vals, points, corner, value, mean_in, mean_out,
            )  # fmt: skip
            film_of[first:n] = film
            if ends and n > first:
                partly[c] = 1
        number[c] = n - before
    return tri[:n].copy(), film_of[:n].copy(), outer_of[:n].copy(), number, partly


def bare_triangles(
    cells: np.ndarray, contents: np.ndarray, corner_offsets: np.ndarray, shape: tuple[int, int, int],
    row_of: np.ndarray, values: np.ndarray, code: np.ndarray, count: np.ndarray, start: np.ndarray,
    interval_code: np.ndarray, ti: np.ndarray, bi: np.ndarray, gi: np.ndarray, stage: np.ndarray, source: np.ndarray,
    is_open: np.ndarray, piece: np.ndarray, zc: np.ndarray, dx: float, dy: float,
) -> tuple[np.ndarray, ...]:  # fmt: skip
    """The bare triangles of staged films in mixed cells with these `contents (cells,)`, of `kernels.contents`.

    The etchant comes from the films that `source` marks; where none is marked, from the voids whose roots `is_open`
    marks.

    Returns
    -------
    triangles : (n, 3, 3) float64, um from the first sample in x and y; cell after cell
    films, outer : (n,) int16, the film and the code that it lies bare to
    number : (cells,) int32, how many triangles each cell has
    partly : (cells,) uint8, whether the bare surface of some film may end in the cell
    """

    def run(first: int) -> tuple[np.ndarray, ...]:
        some = slice(first, first + RUN)
        part: tuple[np.ndarray, ...] = _triangles_in(
            cells[some], contents[some], corner_offsets, shape, row_of, values, code, count, start, interval_code, ti,
            bi, gi, stage, source, is_open, piece, zc, dx, dy,
        )  # fmt: skip
        return part

    with ThreadPoolExecutor(get_num_threads()) as threads:
        found = list(threads.map(run, range(0, max(len(cells), 1), RUN)))
    return tuple(np.concatenate(parts) for parts in zip(*found, strict=True))
