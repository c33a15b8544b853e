"""Which film or void is where, to a small fraction of a cell, and what touches what.

A grid's cells are cut into tetrahedra (Freudenthal's division) on which every field is linear. A
film is then the overlap of at most three half spaces, hence convex in each tetrahedron, and its
pieces can be joined exactly through the edges, however thin they are.

A point's *code* is the number of its film, or, in a void, -1 (under no film) or -1 - k where k is
the first film that was laid over the point after it had last been filled.

Field values of a sample lie side by side in one row; `ti, bi, gi` give for each film the columns of
its top, floor and gone fields, -1 where it has none.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

MAX_INTERVALS = 24
RUN = 1024  # samples that a thread takes at a time
SLIVER = 2e-5  # shortest interval of an edge that counts, as a share of the edge
SAME_FACE = 2e-3  # of a sample's spacing: two distances no farther apart are those of one face
CRACK = 0.02  # the same for a void between two solids: thinner ones come of cut corners, not of gaps

# Edges of the division leave a sample towards these neighbours (dz, dy, dx).
EDGE_STEPS = np.array(
    [(0, 0, 1), (0, 1, 0), (1, 0, 0), (0, 1, 1), (1, 0, 1), (1, 1, 0), (1, 1, 1)], dtype=np.int64
)
# Corners of the six tetrahedra of a cell; bit 0 is x, bit 1 is y, bit 2 is z.
TETRAHEDRA = np.array(
    [(0, 1, 3, 7), (0, 1, 5, 7), (0, 2, 3, 7), (0, 2, 6, 7), (0, 4, 5, 7), (0, 4, 6, 7)], dtype=np.int64
)
# Direction of the edge between two corners, by the difference of their bits.
STEP_OF_BITS = np.array([-1, 0, 1, 3, 2, 4, 5, 6], dtype=np.int64)


@njit(cache=True, parallel=True)
def paint(code, top, floor, gone, has_floor, has_gone, k):
    """Enter film `k` into the codes of all samples, `(n,)` int16; films come oldest first."""
    for i in prange(code.size):
        if code[i] < 0 and top[i] < 0:
            if not has_floor or floor[i] >= 0:
                if not has_gone or gone[i] < 0:
                    code[i] = k
                else:
                    code[i] = -1
            elif code[i] == -1:
                code[i] = -1 - k


@njit(cache=True, parallel=True)
def gather(a, b, c, d, samples, values, column, number):
    """Enter the values of up to four flat fields at samples into `values (m, fields)` from a column on.

    Four at a time, since each row of the table is then fetched once for all of them.
    """
    for s in prange(samples.size):
        i = samples[s]
        values[s, column] = a[i]
        if number > 1:
            values[s, column + 1] = b[i]
        if number > 2:
            values[s, column + 2] = c[i]
        if number > 3:
            values[s, column + 3] = d[i]


@njit(cache=True)
def films_in(codes, films):
    """Which of the films occur among the codes, `(films,)` bool."""
    found = np.zeros(films, np.bool_)
    for i in range(codes.size):
        if codes[i] >= 0:
            found[codes[i]] = True
    return found


@njit(cache=True)
def code_of(values, ti, bi, gi):
    """The code of a point from its field values, `(fields,)` float."""
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
def _laid_on(v, reach, k, j, ti, bi, gi):
    """Whether film k was laid on a face of film j that still is the one nearest to a sample in j, of values v."""
    if bi[k] < 0 or v[bi[k]] >= 0:
        return False
    nearest = v[ti[j]]
    if gi[j] >= 0:
        nearest = max(nearest, v[gi[j]])
    if bi[j] >= 0:
        nearest = max(nearest, -v[bi[j]])
    return abs(nearest - v[bi[k]]) < SAME_FACE * reach


@njit(cache=True)
def _bedded(va, vb, ti, bi, gi, code_out, end_out, m):
    """Close the voids between a film and what it was laid on.

    In a concave corner the floor of a film, one interpolated distance, runs clear of the faces that it
    stands for, by up to half a sample.
    """
    if m < 3:
        return m
    k = -1 - code_out[1]
    if code_out[0] >= 0 and 0 < k == code_out[2]:
        if _laid_on(va, abs(vb[bi[k]] - va[bi[k]]), k, code_out[0], ti, bi, gi):
            for r in range(1, m - 1):
                code_out[r] = code_out[r + 1]
                end_out[r] = end_out[r + 1]
            m -= 1
    if m < 3:
        return m
    k = -1 - code_out[m - 2]
    if code_out[m - 1] >= 0 and 0 < k == code_out[m - 3]:
        if _laid_on(vb, abs(vb[bi[k]] - va[bi[k]]), k, code_out[m - 1], ti, bi, gi):
            end_out[m - 3] = end_out[m - 2]
            code_out[m - 2] = code_out[m - 1]
            end_out[m - 2] = end_out[m - 1]
            m -= 1
    return m


@njit(cache=True)
def _closed(code_out, end_out, m):
    """Close the cracks of a partition: voids between two solids thinner than `CRACK`."""
    q = 1
    while q < m - 1:
        if code_out[q] < 0 <= code_out[q - 1] and code_out[q + 1] >= 0 and end_out[q] - end_out[q - 1] < CRACK:
            same = code_out[q - 1] == code_out[q + 1]
            if not same:
                end_out[q - 1] = 0.5 * (end_out[q - 1] + end_out[q])
            shift = 2 if same else 1
            if same:
                end_out[q - 1] = end_out[q + 1]
            for r in range(q, m - shift):
                code_out[r] = code_out[r + shift]
                end_out[r] = end_out[r + shift]
            m -= shift
        else:
            q += 1
    return m


@njit(cache=True)
def partition(va, vb, ti, bi, gi, code_out, end_out, cuts, mid):
    """Cut the edge between two samples into intervals of one code.

    Writes the codes and the intervals' upper ends (share of the edge, the last is 1) and returns
    their number; intervals shorter than `SLIVER` are dropped. The first and the last always have the
    codes of the samples at the ends, however short. `cuts (MAX_INTERVALS,)` and `mid (fields,)` float64
    are scratch.
    """
    n = 0
    for f in range(va.size):
        a = va[f]
        b = vb[f]
        if (a < 0) != (b < 0) and n < MAX_INTERVALS - 1:
            c = a / (a - b)
            j = n
            while j > 0 and cuts[j - 1] > c:
                cuts[j] = cuts[j - 1]
                j -= 1
            cuts[j] = c
            n += 1
    low = 0.0
    m = 0
    for j in range(n + 1):
        high = cuts[j] if j < n else 1.0
        if high - low < SLIVER and 0 < j < n:  # the ends stand for their samples, however short they are
            continue
        if j == 0:
            code = code_of(va, ti, bi, gi)
        elif j == n:
            code = code_of(vb, ti, bi, gi)
        else:
            s = 0.5 * (low + high)
            for f in range(va.size):
                mid[f] = va[f] + s * (vb[f] - va[f])
            code = code_of(mid, ti, bi, gi)
        if m > 0 and code_out[m - 1] == code:
            end_out[m - 1] = high
        else:
            code_out[m] = code
            end_out[m] = high
            m += 1
        low = high
    end_out[m - 1] = 1.0
    return _closed(code_out, end_out, _bedded(va, vb, ti, bi, gi, code_out, end_out, m))


@njit(cache=True, parallel=True)
def mixed_cells(code):
    """Mark each cell between samples, by its first sample, `(nz, ny, nx)` bool, whose corners differ in code."""
    nz, ny, nx = code.shape
    mixed = np.zeros((nz, ny, nx), np.bool_)
    for z in prange(nz - 1):
        for y in range(ny - 1):
            for x in range(nx - 1):
                c = code[z, y, x]
                mixed[z, y, x] = (
                    code[z, y, x + 1] != c
                    or code[z, y + 1, x] != c
                    or code[z, y + 1, x + 1] != c
                    or code[z + 1, y, x] != c
                    or code[z + 1, y, x + 1] != c
                    or code[z + 1, y + 1, x] != c
                    or code[z + 1, y + 1, x + 1] != c
                )
    return mixed


@njit(cache=True)
def near_samples(mixed):
    """Mark the samples at the corners of mixed cells, `(nz, ny, nx)` bool."""
    nz, ny, nx = mixed.shape
    near = np.zeros((nz, ny, nx), np.bool_)
    for z in range(nz - 1):
        for y in range(ny - 1):
            for x in range(nx - 1):
                if mixed[z, y, x]:
                    near[z : z + 2, y : y + 2, x : x + 2] = True
    return near


@njit(cache=True)
def _one_cut(values, s, r):
    """Where the edge between two samples of unlike codes is cut, if all its cuts are one within a `SLIVER`; else -1."""
    low, high = 2.0, -1.0
    for f in range(values.shape[1]):
        a, b = values[s, f], values[r, f]
        if (a < 0) != (b < 0):
            c = np.float64(a / (a - b))
            low, high = min(low, c), max(high, c)
    return low if high - low < SLIVER else -1.0


@njit(cache=True, parallel=True)
def cut_edges(samples, row_of, code, values, ti, bi, gi, strides, shape):
    """Count the intervals on every edge from every near sample, `(m, 7)` uint8; 0 where one code."""
    m = samples.size
    count = np.zeros((m, 7), np.uint8)
    nz, ny, nx = shape
    for run in prange((m + RUN - 1) // RUN):
        codes, ends = np.empty(MAX_INTERVALS, np.int16), np.empty(MAX_INTERVALS, np.float32)
        cuts, mid = np.empty(MAX_INTERVALS, np.float64), np.empty(values.shape[1], np.float64)
        for s in range(run * RUN, min(run * RUN + RUN, m)):
            i = samples[s]
            z, y, x = i // (ny * nx), (i // nx) % ny, i % nx
            for d in range(7):
                if z + EDGE_STEPS[d, 0] >= nz or y + EDGE_STEPS[d, 1] >= ny or x + EDGE_STEPS[d, 2] >= nx:
                    continue
                j = i + strides[d]
                if code[i] == code[j] or row_of[j] < 0:
                    continue
                if _one_cut(values, s, row_of[j]) >= 0:
                    count[s, d] = 2
                else:
                    count[s, d] = partition(values[s], values[row_of[j]], ti, bi, gi, codes, ends, cuts, mid)
    return count


@njit(cache=True)
def edge_starts(count):
    """Where the intervals of every edge begin, `(7 m + 1,)` int64."""
    flat = count.reshape(-1)
    start = np.empty(flat.size + 1, np.int64)
    total = 0
    for e in range(flat.size):
        start[e] = total
        total += np.int64(flat[e])
    start[-1] = total
    return start


@njit(cache=True, parallel=True)
def fill_edges(samples, row_of, code, values, ti, bi, gi, strides, count, start):
    """Codes and upper ends of the intervals counted by `cut_edges`, edge after edge."""
    total = start[-1]
    code_out = np.empty(total, np.int16)
    end_out = np.empty(total, np.float32)
    m = samples.size
    for run in prange((m + RUN - 1) // RUN):
        codes, ends = np.empty(MAX_INTERVALS, np.int16), np.empty(MAX_INTERVALS, np.float32)
        cuts, mid = np.empty(MAX_INTERVALS, np.float64), np.empty(values.shape[1], np.float64)
        for s in range(run * RUN, min(run * RUN + RUN, m)):
            for d in range(7):
                n = np.int64(count[s, d])
                if n == 0:
                    continue
                j = samples[s] + strides[d]
                at = start[s * 7 + d]
                cut = _one_cut(values, s, row_of[j]) if n == 2 else -1.0
                if cut >= 0:
                    code_out[at], code_out[at + 1] = code[samples[s]], code[j]
                    end_out[at], end_out[at + 1] = cut, 1.0
                    continue
                partition(values[s], values[row_of[j]], ti, bi, gi, codes, ends, cuts, mid)
                for q in range(n):
                    code_out[at + q] = codes[q]
                    end_out[at + q] = ends[q]
    return code_out, end_out
