"""Where an etch front can go and where it starts: nodes, links and starting times.

A node is a (sample, film) pair. A film's own samples are nodes; a sample just outside is one too
where the film is so thin there that it holds at most one sample across, so that fronts run along
films of any thickness. A node never links to another film through something that is not etched.

`stage[code]` is 1 for the films that are etched, 0 for the rest.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

EDGE_STEPS = np.array(
    [(0, 0, 1), (0, 1, 0), (1, 0, 0), (0, 1, 1), (1, 0, 1), (1, 1, 0), (1, 1, 1)], dtype=np.int64
)
TETRAHEDRA = np.array(
    [(0, 1, 3, 7), (0, 1, 5, 7), (0, 2, 3, 7), (0, 2, 6, 7), (0, 4, 5, 7), (0, 4, 6, 7)], dtype=np.int64
)
HEAD_ON = 0.8  # cosine above which a front comes at a thin film across it and not along it
NUDGE = 0.01  # how far, as a share of a cell, either side of a face is looked at
DEPTH = 3  # times a face is halved where it is partly covered


@njit(cache=True)
def thin_nodes(samples, code, stage, open_space, strides, shape, count, start, interval_code, interval_end, zc, dx, dy):
    """Nodes of films at samples just outside them, where at most one sample lies across the film.

    Returns flat sample numbers, film numbers and the places `(m, 3)` (x, y, z; um from the first
    sample) of the film on the edge that made the node; a node may be listed more than once.
    """
    nz, ny, nx = shape
    size = 4
    for s in range(samples.size):
        for d in range(3):
            size += 2 * count[s, d]
    sample = np.empty(size, np.int64)
    film = np.empty(size, np.int64)
    place = np.empty((size, 3), np.float32)
    m = 0
    for s in range(samples.size):
        i = samples[s]
        for d in range(3):
            n = np.int64(count[s, d])
            if n == 0:
                continue
            j = i + strides[d]
            at = start[s * 7 + d]
            for q in range(n):
                c = interval_code[at + q]
                if c < 0 or stage[c] == 0:
                    continue
                low = 0.0 if q == 0 else interval_end[at + q - 1]
                mid = 0.5 * (low + interval_end[at + q])
                for side in range(2):
                    outer = i if side == 0 else j
                    inner = j if side == 0 else i
                    if code[outer] == c or open_space[outer]:
                        continue
                    if code[inner] == c:
                        beyond = inner + strides[d] if side == 0 else inner - strides[d]
                        pos = inner // (ny * nx) if d == 2 else ((inner // nx) % ny if d == 1 else inner % nx)
                        last = nz if d == 2 else (ny if d == 1 else nx)
                        inside = pos + 1 < last if side == 0 else pos > 0
                        if inside and code[beyond] == c:
                            continue
                    sample[m] = outer
                    film[m] = c
                    z = i // (ny * nx)
                    y = (i // nx) % ny
                    x = i % nx
                    place[m, 0] = (x + (mid if d == 0 else 0.0)) * dx
                    place[m, 1] = (y + (mid if d == 1 else 0.0)) * dy
                    place[m, 2] = zc[z] + (mid * (zc[z + 1] - zc[z]) if d == 2 else 0.0)
                    m += 1
    return sample[:m], film[:m], place[:m]


@njit(cache=True)
def lookup(keys, key):
    """Position of `key` in the sorted `keys`, or -1."""
    low = 0
    high = keys.size
    while low < high:
        mid = (low + high) // 2
        if keys[mid] < key:
            low = mid + 1
        else:
            high = mid
    return low if low < keys.size and keys[low] == key else -1


@njit(cache=True)
def _passes(row_of, count, start, interval_code, stage, i, j, d):
    """Whether every interval of the edge from sample i to j (direction d) is etched."""
    s = row_of[i]
    if s < 0 or count[s, d] == 0:
        return True
    at = start[s * 7 + d]
    for q in range(count[s, d]):
        c = interval_code[at + q]
        if c < 0 or stage[c] == 0:
            return False
    return True


@njit(cache=True, parallel=True)
def link(node_sample, node_film, own, keys, first_thin, code, stage, shape, row_of, count, start, interval_code):
    """Neighbour table of the nodes, `(n, 6)` int32 in the order -x, +x, -y, +y, -z, +z; -1 for none."""
    nz, ny, nx = shape
    films = stage.size
    nbr = np.full((node_sample.size, 6), -1, np.int32)
    for a in prange(node_sample.size):
        i = node_sample[a]
        m = node_film[a]
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
            step = 1 if d == 0 else (nx if d == 1 else ny * nx)
            j = i + step if up else i - step
            if code[j] == m:
                nbr[a, k] = own[j]
                continue
            if row_of[j] >= 0:
                p = lookup(keys, j * films + m)
                if p >= 0:
                    nbr[a, k] = first_thin + p
                    continue
            if code[i] == m and code[j] >= 0 and stage[code[j]] != 0:
                if _passes(row_of, count, start, interval_code, stage, i if up else j, j if up else i, d):
                    nbr[a, k] = own[j]
    return nbr


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
    inside = 0
    low = np.empty(4, np.int64)
    high = np.empty(4, np.int64)
    nh = 0
    for a in range(4):
        if vals[a, f] < 0:
            low[inside] = a
            inside += 1
        else:
            high[nh] = a
            nh += 1
    m = 0
    for p in range(inside):
        for q0 in range(nh):
            q = q0 if p % 2 == 0 else nh - 1 - q0
            a = low[p]
            b = high[q]
            s = vals[a, f] / (vals[a, f] - vals[b, f])
            for g in range(vals.shape[1]):
                out_values[m, g] = vals[a, g] + s * (vals[b, g] - vals[a, g])
            for g in range(3):
                out_points[m, g] = points[a, g] + s * (points[b, g] - points[a, g])
            m += 1
    return m


@njit(cache=True)
def _closest(p, a, b, c):
    """The point of the triangle a b c closest to p."""
    ab = b - a
    ac = c - a
    ap = p - a
    d1 = ab[0] * ap[0] + ab[1] * ap[1] + ab[2] * ap[2]
    d2 = ac[0] * ap[0] + ac[1] * ap[1] + ac[2] * ap[2]
    if d1 <= 0 and d2 <= 0:
        q = a
    else:
        bp = p - b
        d3 = ab[0] * bp[0] + ab[1] * bp[1] + ab[2] * bp[2]
        d4 = ac[0] * bp[0] + ac[1] * bp[1] + ac[2] * bp[2]
        cp = p - c
        d5 = ab[0] * cp[0] + ab[1] * cp[1] + ab[2] * cp[2]
        d6 = ac[0] * cp[0] + ac[1] * cp[1] + ac[2] * cp[2]
        vc = d1 * d4 - d3 * d2
        vb = d5 * d2 - d1 * d6
        va = d3 * d6 - d5 * d4
        if d3 >= 0 and d4 <= d3:
            q = b
        elif d6 >= 0 and d5 <= d6:
            q = c
        elif vc <= 0 and d1 >= 0 and d3 <= 0:
            q = a + (d1 / (d1 - d3) if d1 > d3 else 0.0) * ab
        elif vb <= 0 and d2 >= 0 and d6 <= 0:
            q = a + (d2 / (d2 - d6) if d2 > d6 else 0.0) * ac
        elif va <= 0 and d4 - d3 >= 0 and d5 - d6 >= 0:
            w = d4 - d3 + d5 - d6
            q = b + ((d4 - d3) / w if w > 0 else 0.0) * (c - b)
        else:
            w = 1.0 / (va + vb + vc)
            q = a + (vb * w) * ab + (vc * w) * ac
    return q


@njit(cache=True)
def _sides(v, mean_in, mean_out, ti, bi, gi, work):
    """Codes just inside and just outside a face at a point with field values v."""
    for g in range(v.size):
        work[g] = v[g] + NUDGE * (mean_in[g] - v[g])
    inner = _code_of(work, ti, bi, gi)
    for g in range(v.size):
        work[g] = v[g] + NUDGE * (mean_out[g] - v[g])
    return inner, _code_of(work, ti, bi, gi)


@njit(cache=True)
def bare_faces(vals, points, f, film, source, ti, bi, gi, tri_out):
    """Triangles of field f's surface in a tetrahedron where `film` lies bare to the source.

    `source[code + offset]` is 1 for the codes that the etchant comes from. Returns their number and
    whether some of the surface of the film is covered.
    """
    nf = vals.shape[1]
    offset = source.size // 2
    corner = np.empty((4, 3), np.float64)
    value = np.empty((4, nf), np.float64)
    m = _face(f, vals, points, corner, value)
    mean_in = np.zeros(nf, np.float64)
    mean_out = np.zeros(nf, np.float64)
    n_in = 0
    for a in range(4):
        if vals[a, f] < 0:
            n_in += 1
            mean_in += vals[a]
        else:
            mean_out += vals[a]
    mean_in /= n_in
    mean_out /= 4 - n_in
    if f != ti[film] and (gi[film] < 0 or f != gi[film]):  # the floor: the film is on its positive side
        swap = mean_in
        mean_in = mean_out
        mean_out = swap
    work = np.empty(nf, np.float64)
    bare_corner = np.zeros(3, np.bool_)
    stack_p = np.empty((64, 3, 3), np.float64)
    stack_v = np.empty((64, 3, nf), np.float64)
    level = np.empty(64, np.int64)
    n = 0
    for t in range(m - 2):
        for g in range(3):
            q = 0 if g == 0 else t + g
            stack_p[n, g] = corner[q]
            stack_v[n, g] = value[q]
        level[n] = 0
        n += 1
    found = 0
    covered = False
    while n > 0:
        n -= 1
        p = stack_p[n].copy()
        v = stack_v[n].copy()
        depth = level[n]
        bare = 0
        for g in range(3):
            w = v[g] * 0.98 + (v[0] + v[1] + v[2]) * (0.02 / 3)
            inner, outer = _sides(w, mean_in, mean_out, ti, bi, gi, work)
            bare_corner[g] = inner == film and source[outer + offset] != 0
            if bare_corner[g]:
                bare += 1
            elif inner == film:
                covered = True
        centre = (v[0] + v[1] + v[2]) / 3
        inner, outer = _sides(centre, mean_in, mean_out, ti, bi, gi, work)
        middle = inner == film and source[outer + offset] != 0
        if (bare == 3 and middle) or (depth == DEPTH and middle):
            if found < tri_out.shape[0]:
                tri_out[found] = p
                found += 1
        elif depth < DEPTH and (bare > 0 or middle):
            for k in range(4):
                for g in range(3):
                    if k == 3:
                        stack_p[n, g] = 0.5 * (p[g] + p[(g + 1) % 3])
                        stack_v[n, g] = 0.5 * (v[g] + v[(g + 1) % 3])
                    else:
                        stack_p[n, g] = 0.5 * (p[k] + p[g])
                        stack_v[n, g] = 0.5 * (v[k] + v[g])
                level[n] = depth + 1
                n += 1
        elif bare > 0:  # too small to cut further: its bare corners stand for it
            for g in range(3):
                if bare_corner[g] and found < tri_out.shape[0]:
                    tri_out[found, 0] = p[g]
                    tri_out[found, 1] = p[g]
                    tri_out[found, 2] = p[g]
                    found += 1
    return found, covered


@njit(cache=True)
def node_at(i, m, code, own, keys, first_thin, row_of, films):
    """The node of film m at sample i, or -1."""
    if code[i] == m:
        return own[i]
    if row_of[i] < 0:
        return -1
    p = lookup(keys, i * films + m)
    return first_thin + p if p >= 0 else -1


@njit(cache=True)
def cell_films(base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, present):
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


@njit(cache=True)
def open_codes(base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, is_open, piece, mark):
    """Mark in `mark` (by code + half its size) the codes of the open voids that reach into a cell."""
    n = code.size
    offset = mark.size // 2
    for a in range(8):
        i = base + corner_offsets[a]
        if code[i] < 0 and is_open[piece[i]] != 0:
            mark[code[i] + offset] = 1
        s = row_of[i]
        for b in range(a + 1, 8):
            if (a & b) == a:
                d = step_of_bits[b - a]
                at = start[s * 7 + d]
                for q in range(1, np.int64(count[s, d]) - 1):
                    c = interval_code[at + q]
                    if c < 0 and is_open[piece[n + at + q]] != 0:
                        mark[c + offset] = 1


@njit(cache=True)
def start_times(
    cells, base_time, corner_offsets, step_of_bits, shape, row_of, values, code, count, start, interval_code,
    ti, bi, gi, stage, source, is_open, piece, own, keys, first_thin, place, slowness, zc, dx, dy, time, beyond,
):  # fmt: skip
    """Lower `time` of nodes near bare faces to their distance from them times their slowness.

    `source` marks the films that the etchant comes from; where none is marked it comes from the voids
    whose roots `is_open` marks. `base_time (cells,)` is when the source reaches each cell, inf where it does not;
    `time (nodes,)` holds what is known; `place (nodes, 3)` where each node's film is. Where a face
    ends under a cover the exact distance is given to the nodes two samples away too, as no
    difference scheme can find it there. `beyond (nodes,)` takes how much farther, um, a front
    that comes across a thin film has to go from the node's place to its sample.
    """
    nz, ny, nx = shape
    films = stage.size
    nf = values.shape[1]
    present = np.empty(films, np.int64)
    vals = np.empty((4, nf), np.float64)
    points = np.empty((4, 3), np.float64)
    triangles = np.empty((600, 3, 3), np.float64)
    tet_triangles = np.empty((150, 3, 3), np.float64)
    from_void = not source.any()
    here = source.copy()
    away = np.empty(3, np.float64)
    for c in range(cells.size):
        if not base_time[c] < np.inf:
            continue
        base = cells[c]
        bz = base // (ny * nx)
        by = (base // nx) % ny
        bx = base % nx
        cell_films(base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, present)
        if from_void:
            here[:] = 0
            open_codes(
                base, corner_offsets, row_of, code, count, start, interval_code, step_of_bits, is_open, piece, here
            )
        for film in range(films):
            if present[film] == 0 or stage[film] == 0:
                continue
            n = 0
            partly = False
            for t in range(6):
                for a in range(4):
                    o = TETRAHEDRA[t, a]
                    vals[a] = values[row_of[base + corner_offsets[o]]]
                    points[a, 0] = (bx + (o & 1)) * dx
                    points[a, 1] = (by + ((o >> 1) & 1)) * dy
                    points[a, 2] = zc[bz + (o >> 2)]
                for face in range(3):
                    f = ti[film] if face == 0 else (bi[film] if face == 1 else gi[film])
                    if f < 0:
                        continue
                    negative = 0
                    for a in range(4):
                        negative += vals[a, f] < 0
                    if negative == 0 or negative == 4:
                        continue
                    found, covered = bare_faces(vals, points, f, film, here, ti, bi, gi, tet_triangles)
                    partly |= covered
                    for k in range(found):
                        if n < triangles.shape[0]:
                            triangles[n] = tet_triangles[k]
                            n += 1
            if n == 0:
                continue
            reach = 1 if partly else 0
            for z in range(max(bz - reach, 0), min(bz + 2 + reach, nz)):
                for y in range(max(by - reach, 0), min(by + 2 + reach, ny)):
                    for x in range(max(bx - reach, 0), min(bx + 2 + reach, nx)):
                        a = node_at((z * ny + y) * nx + x, film, code, own, keys, first_thin, row_of, films)
                        if a < 0:
                            continue
                        near_z = min(max(z, bz), bz + 1)
                        near_y = min(max(y, by), by + 1)
                        near_x = min(max(x, bx), bx + 1)
                        if near_z != z or near_y != y or near_x != x:
                            near = (near_z * ny + near_y) * nx + near_x
                            if node_at(near, film, code, own, keys, first_thin, row_of, films) < 0:
                                continue
                        p = place[a].astype(np.float64)
                        away[0] = x * dx - p[0]
                        away[1] = y * dy - p[1]
                        away[2] = zc[z] - p[2]
                        length = np.sqrt(away[0] * away[0] + away[1] * away[1] + away[2] * away[2])
                        best = np.inf
                        far = 0.0
                        for k in range(n):
                            r = p - _closest(p, triangles[k, 0], triangles[k, 1], triangles[k, 2])
                            d = np.sqrt(r[0] * r[0] + r[1] * r[1] + r[2] * r[2])
                            if d < best:
                                best = d
                                far = (r[0] * away[0] + r[1] * away[1] + r[2] * away[2]) / max(d, 1e-9)
                        arrived = base_time[c] + best * slowness[a]
                        if arrived < time[a]:
                            time[a] = arrived
                            beyond[a] = far if abs(far) > HEAD_ON * length else 0.0


@njit(cache=True, parallel=True)
def spread_once(value, known, want):
    """Give each wanted sample that is unknown the mean of its known neighbours (axis ones first).

    Writes into copies, so that the result does not depend on the order; returns (value, known).
    """
    nz, ny, nx = value.shape
    out = value.copy()
    done = known.copy()
    for z in prange(nz):
        for y in range(ny):
            for x in range(nx):
                if known[z, y, x] or not want[z, y, x]:
                    continue
                best = 4
                total = 0.0
                n = 0
                for dz in range(-1, 2):
                    for dy in range(-1, 2):
                        for dx in range(-1, 2):
                            k = abs(dz) + abs(dy) + abs(dx)
                            a = z + dz
                            b = y + dy
                            c = x + dx
                            if k == 0 or k > best or a < 0 or b < 0 or c < 0 or a >= nz or b >= ny or c >= nx:
                                continue
                            if not known[a, b, c]:
                                continue
                            if k < best:
                                best = k
                                total = 0.0
                                n = 0
                            total += value[a, b, c]
                            n += 1
                if n > 0:
                    out[z, y, x] = total / n
                    done[z, y, x] = True
    return out, done


@njit(cache=True)
def bare_voids(samples, code, open_space, strides, count, start, interval_code, film):
    """Mark the open-space samples whose void borders on `film` along an axis edge, `(n,)` bool."""
    out = np.zeros(code.size, np.bool_)
    for s in range(samples.size):
        i = samples[s]
        for d in range(3):
            n = np.int64(count[s, d])
            if n < 2:
                continue
            at = start[s * 7 + d]
            j = i + strides[d]
            if open_space[i] and interval_code[at + 1] == film:
                out[i] = True
            if open_space[j] and interval_code[at + n - 2] == film:
                out[j] = True
    return out


@njit(cache=True)
def cell_base_times(cells, corner_offsets, code, source, offset, own, time):
    """Earliest known time at the corners of each cell that belong to a source film, `(cells,)`."""
    out = np.full(cells.size, np.inf, np.float64)
    for c in range(cells.size):
        for a in range(8):
            i = cells[c] + corner_offsets[a]
            if code[i] >= 0 and source[code[i] + offset] != 0 and own[i] >= 0:
                out[c] = min(out[c], time[own[i]])
    return out


@njit(cache=True)
def _edge_time(i, j, n, q, time, open_space):
    """When a front is at the film of interval q of the edge i-j, from the samples at its ends."""
    best = min(time[i], time[j])
    if n > 2 and not best < np.inf and (open_space[i] or open_space[j]):
        best = 0.0
    return best


@njit(cache=True)
def last_contact(samples, code, strides, count, start, interval_code, piece, pieces, film, time, open_space):
    """Latest arrival in `film` where it touches one of the `pieces` along an axis edge.

    `time (n,)` are the film's arrival times at samples. Returns (time, sample), sample -1 for no contact.
    """
    n = code.size
    worst = -1.0
    where = -1
    for s in range(samples.size):
        i = samples[s]
        for d in range(3):
            m = np.int64(count[s, d])
            at = start[s * 7 + d]
            for q in range(m):
                if interval_code[at + q] != film:
                    continue
                for r in (q - 1, q + 1):
                    if r < 0 or r >= m or interval_code[at + r] < 0 or interval_code[at + r] == film:
                        continue
                    j = i + strides[d]
                    node = i if r == 0 else (j if r == m - 1 else n + at + r)
                    root = piece[node]
                    low = lookup(pieces, root)
                    if low < 0:
                        continue
                    arrived = _edge_time(i, j, m, q, time, open_space)
                    if arrived > worst:
                        worst = arrived
                        where = i if code[i] == film else j
    return worst, where


@njit(cache=True)
def contact_times(samples, code, strides, count, start, interval_code, film, time, open_space):
    """When a front gets to each vertical edge on which something lies on top of `film`, s."""
    out = np.empty(samples.size, np.float64)
    m = 0
    for s in range(samples.size):
        n = np.int64(count[s, 2])
        at = start[s * 7 + 2]
        for q in range(n - 1):
            if interval_code[at + q] == film:
                above = interval_code[at + q + 1]
                i = samples[s]
                j = i + strides[2]
                out[m] = 0.0 if above < 0 else min(time[i], time[j])
                m += 1
    return out[:m]


@njit(cache=True)
def bare_pieces(samples, code, strides, count, start, interval_code, piece, open_roots, film):
    """Roots of the pieces of `film` that border on an open void along some edge; may repeat."""
    n = code.size
    out = np.empty(2 * samples.size + 16, np.int64)
    m = 0
    for s in range(samples.size):
        i = samples[s]
        for d in range(7):
            k = np.int64(count[s, d])
            at = start[s * 7 + d]
            for q in range(k):
                if interval_code[at + q] != film:
                    continue
                for r in (q - 1, q + 1):
                    if r < 0 or r >= k or interval_code[at + r] >= 0:
                        continue
                    j = i + strides[d]
                    void = i if r == 0 else (j if r == k - 1 else n + at + r)
                    node = i if q == 0 else (j if q == k - 1 else n + at + q)
                    if lookup(open_roots, piece[void]) >= 0 and m < out.size:
                        if m == 0 or out[m - 1] != piece[node]:
                            out[m] = piece[node]
                            m += 1
    return out[:m]
