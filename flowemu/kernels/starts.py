"""Where an etch front starts: exact distances of nodes from the bare faces of their films.

Every node near a cell with bare triangles (`kernels.faces`) takes the least distance to all triangles in
reach. Where a face ends under a cover the reach is longer, as no difference scheme can follow a front
round a corner from its first samples.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

NEAR = 1  # cells beyond its own from which a node looks for faces
FAR = 3  # the same where a face ends under a cover
STEADY = 0.75  # of a plane's spacing that the next ones have at least (1 / 1.3, as the grid sees to)
HEAD_ON = 0.8  # cosine above which a front comes at a thin film across it and not along it


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
def _closest(px, py, pz, triangles, q):
    """The point of triangle q of `(n, 3, 3)` closest to a point.

    References
    ----------
    C. Ericson, Real-Time Collision Detection, Morgan Kaufmann, 2005, section 5.1.5 (from memory).
    """
    ax, ay, az = triangles[q, 0, 0], triangles[q, 0, 1], triangles[q, 0, 2]
    ux, uy, uz = triangles[q, 1, 0] - ax, triangles[q, 1, 1] - ay, triangles[q, 1, 2] - az
    vx, vy, vz = triangles[q, 2, 0] - ax, triangles[q, 2, 1] - ay, triangles[q, 2, 2] - az
    wx, wy, wz = px - ax, py - ay, pz - az
    d1 = ux * wx + uy * wy + uz * wz
    d2 = vx * wx + vy * wy + vz * wz
    if d1 <= 0 and d2 <= 0:
        return ax, ay, az
    bx, by, bz = wx - ux, wy - uy, wz - uz
    d3 = ux * bx + uy * by + uz * bz
    d4 = vx * bx + vy * by + vz * bz
    if d3 >= 0 and d4 <= d3:
        return ax + ux, ay + uy, az + uz
    cx, cy, cz = wx - vx, wy - vy, wz - vz
    d5 = ux * cx + uy * cy + uz * cz
    d6 = vx * cx + vy * cy + vz * cz
    if d6 >= 0 and d5 <= d6:
        return ax + vx, ay + vy, az + vz
    vc = d1 * d4 - d3 * d2
    if vc <= 0 and d1 >= 0 and d3 <= 0:
        s = d1 / (d1 - d3) if d1 > d3 else 0.0
        return ax + s * ux, ay + s * uy, az + s * uz
    vb = d5 * d2 - d1 * d6
    if vb <= 0 and d2 >= 0 and d6 <= 0:
        s = d2 / (d2 - d6) if d2 > d6 else 0.0
        return ax + s * vx, ay + s * vy, az + s * vz
    va = d3 * d6 - d5 * d4
    if va <= 0 and d4 - d3 >= 0 and d5 - d6 >= 0:
        w = d4 - d3 + d5 - d6
        s = (d4 - d3) / w if w > 0 else 0.0
        return ax + ux + s * (vx - ux), ay + uy + s * (vy - uy), az + uz + s * (vz - uz)
    w = va + vb + vc
    if w == 0:
        return ax, ay, az
    return ax + (vb * ux + vc * vx) / w, ay + (vb * uy + vc * vy) / w, az + (vb * uz + vc * vz) / w


@njit(cache=True)
def _sees(
    px, py, pz, qx, qy, qz, film, medium, code, cell_mixed, row_of, values, ti, bi, gi, shape, zc, dx, dy, mid
):  # fmt: skip
    """Whether the straight line from p to the face at q runs through films of one medium, or void, alone.

    Codes along it come from the fields between the samples (trilinear); `mid (fields,)` is scratch.
    """
    nz, ny, nx = shape
    far = np.sqrt((qx - px) ** 2 + (qy - py) ** 2 + (qz - pz) ** 2) / dx
    steps = int(far * 3) + 2
    for k in range(1, steps):
        s = k / steps
        fx = min(max((px + s * (qx - px)) / dx, 0.0), nx - 1.0)
        fy = min(max((py + s * (qy - py)) / dy, 0.0), ny - 1.0)
        at = pz + s * (qz - pz)
        x = min(int(fx), nx - 2)
        y = min(int(fy), ny - 2)
        z = min(max(np.searchsorted(zc, at) - 1, 0), nz - 2)
        base = (z * ny + y) * nx + x
        here = np.int64(code[base])
        if cell_mixed[base]:
            wx, wy, wz = fx - x, fy - y, (at - zc[z]) / (zc[z + 1] - zc[z])
            mid[:] = 0.0
            for a in range(8):
                w = (wx if a & 1 else 1 - wx) * (wy if a & 2 else 1 - wy) * (wz if a & 4 else 1 - wz)
                r = row_of[base + (a & 1) + ((a >> 1) & 1) * nx + (a >> 2) * ny * nx]
                for f in range(mid.size):
                    mid[f] += w * values[r, f]
            here = _code_of(mid, ti, bi, gi)
        if here >= 0 and medium[here] != medium[film]:
            return False
    return True


@njit(cache=True)
def _gap(p, low, high):
    """How far a coordinate lies outside an interval."""
    return max(low - p, p - high, 0.0)


@njit(cache=True)
def _soonest(px, py, pz, triangles, q, base_time, slow):
    """When a front through triangle q gets to a point, and where on it that comes through.

    Tried are the point of the triangle closest to p, its time between those of the corners, and the corners.
    """
    x, y, z = _closest(px, py, pz, triangles, q)
    level = base_time[q, 0] == base_time[q, 1] and base_time[q, 1] == base_time[q, 2]
    there = base_time[q, 0] if level else _between(x, y, z, triangles, q, base_time)
    best = there + np.sqrt((px - x) * (px - x) + (py - y) * (py - y) + (pz - z) * (pz - z)) * slow
    if level:
        return best, x, y, z
    for k in range(3):
        vx, vy, vz = triangles[q, k, 0], triangles[q, k, 1], triangles[q, k, 2]
        start = base_time[q, k] + np.sqrt((px - vx) ** 2 + (py - vy) ** 2 + (pz - vz) ** 2) * slow
        if start < best:
            best, x, y, z = start, vx, vy, vz
    return best, x, y, z


@njit(cache=True)
def _between(x, y, z, triangles, q, base_time):
    """The corners' times between them, at a point of triangle q; +inf where one of them is."""
    if not base_time[q, 0] + base_time[q, 1] + base_time[q, 2] < np.inf:
        return np.inf
    a, b, c = triangles[q, 0], triangles[q, 1], triangles[q, 2]
    ux, uy, uz = b[0] - a[0], b[1] - a[1], b[2] - a[2]
    vx, vy, vz = c[0] - a[0], c[1] - a[1], c[2] - a[2]
    wx, wy, wz = x - a[0], y - a[1], z - a[2]
    uu, uv, vv = ux * ux + uy * uy + uz * uz, ux * vx + uy * vy + uz * vz, vx * vx + vy * vy + vz * vz
    wu, wv = wx * ux + wy * uy + wz * uz, wx * vx + wy * vy + wz * vz
    det = uu * vv - uv * uv
    if det <= 0.0:
        return max(base_time[q, 0], base_time[q, 1], base_time[q, 2])
    s, t = (wu * vv - wv * uv) / det, (wv * uu - wu * uv) / det
    return base_time[q, 0] * (1 - s - t) + base_time[q, 1] * s + base_time[q, 2] * t


@njit(cache=True)
def _earliest(
    px, py, pz, x, y, z, reach, film, slow, known, open_only, bare_of, box, first, triangles, films_of, base_time,
    least_base, medium, code, cell_mixed, row_of, values, ti, bi, gi, shape, zc, dx, dy, mid,
):  # fmt: skip
    """The earliest start before `known` for a node at p by sample (x, y, z): time, place on a face, and shell.

    Shell 0 are the cells that touch the sample. With `open_only` a face in the others counts only if the
    node sees it. The shell is -1 if there is no such start.
    """
    nz, ny, nx = shape
    best = known
    at_x = at_y = at_z = 0.0
    found = -1
    step = min(dx, dy, zc[min(z + 1, nz - 1)] - zc[z] if z + 1 < nz else dx, zc[z] - zc[z - 1] if z > 0 else dx)
    aside = abs(px - x * dx) + abs(py - y * dy) + abs(pz - zc[z])  # of a thin film's node from its sample
    for r in range(reach + 1):  # shell after shell, so that most of the farther cells can be passed by
        if (r * STEADY * step - aside) * slow >= best:
            break
        for cz in range(max(z - 1 - r, 0), min(z + 1 + r, nz - 1)):
            if _gap(pz, zc[cz], zc[cz + 1]) * slow >= best:
                continue
            for cy in range(max(y - 1 - r, 0), min(y + 1 + r, ny - 1)):
                shell = cz == z - 1 - r or cz == z + r or cy == y - 1 - r or cy == y + r
                for cx in range(x - 1 - r, x + 1 + r, 1 if shell else 2 * r + 1):
                    c = bare_of[(cz * ny + cy) * nx + cx] if 0 <= cx < nx - 1 else -1
                    if c < 0:
                        continue
                    gx = _gap(px, box[c, 0], box[c, 3])
                    gy = _gap(py, box[c, 1], box[c, 4])
                    gz = _gap(pz, box[c, 2], box[c, 5])
                    if least_base[c] + np.sqrt(gx * gx + gy * gy + gz * gz) * slow >= best:
                        continue
                    for q in range(first[c], first[c + 1]):
                        if films_of[q] != film or min(base_time[q, 0], base_time[q, 1], base_time[q, 2]) >= best:
                            continue
                        start, qx, qy, qz = _soonest(px, py, pz, triangles, q, base_time, slow)
                        if start >= best:
                            continue
                        if open_only and r > 0 and not _sees(
                            px, py, pz, qx, qy, qz, film, medium, code, cell_mixed, row_of, values, ti, bi, gi, shape,
                            zc, dx, dy, mid,
                        ):  # fmt: skip
                            continue
                        best = start
                        at_x, at_y, at_z = qx, qy, qz
                        found = r
    return best, at_x, at_y, at_z, found


@njit(cache=True, parallel=True)
def nearest_starts(
    nodes, node_sample, node_film, place, reach, bare_of, box, first, triangles, films_of, base_time, least_base,
    slowness, medium, code, cell_mixed, row_of, values, ti, bi, gi, shape, zc, dx, dy, time, beyond,
):  # fmt: skip
    """Lower `time` of the listed nodes to the earliest start at a bare triangle within reach.

    A start is the triangle's time, from those of its corners, `base_time (triangles, 3)`, plus the distance times the
    node's slowness; `reach (listed,)` is in cells. `bare_of (n,)` numbers the cells that have triangles, -1 for none;
    `box (cells, 6)` is the box round them and `least_base` the least of their base times. `beyond` takes how
    much farther, um, a front that comes across a thin film has to go from the node's place to its sample.
    """
    _, ny, nx = shape
    for k in prange(nodes.size):
        a = nodes[k]
        i = node_sample[a]
        z, y, x = i // (ny * nx), (i // nx) % ny, i % nx
        film = node_film[a]
        px, py, pz = np.float64(place[a, 0]), np.float64(place[a, 1]), np.float64(place[a, 2])
        mid = np.empty(values.shape[1], np.float64)
        for open_only in (False, True):  # the nearest face of all is mostly one that the node sees
            best, qx, qy, qz, found = _earliest(
                px, py, pz, x, y, z, np.int64(reach[k]), film, slowness[a], time[a], open_only, bare_of, box, first,
                triangles, films_of, base_time, least_base, medium, code, cell_mixed, row_of, values, ti, bi, gi,
                shape, zc, dx, dy, mid,
            )  # fmt: skip
            if open_only or found <= 0 or _sees(
                px, py, pz, qx, qy, qz, film, medium, code, cell_mixed, row_of, values, ti, bi, gi, shape, zc, dx, dy,
                mid,
            ):  # fmt: skip
                break
        if found < 0:
            continue
        rx, ry, rz = px - qx, py - qy, pz - qz
        away_x, away_y, away_z = x * dx - px, y * dy - py, zc[z] - pz
        length = np.sqrt(away_x * away_x + away_y * away_y + away_z * away_z)
        further = (rx * away_x + ry * away_y + rz * away_z) / max(np.sqrt(rx * rx + ry * ry + rz * rz), 1e-9)
        time[a] = best
        beyond[a] = further if abs(further) > HEAD_ON * length else 0.0


@njit(cache=True, parallel=True)
def boxes(triangles, first):
    """Box (least and greatest x, y, z) round the triangles of every cell, `(cells, 6)`."""
    out = np.empty((first.size - 1, 6), np.float64)
    for c in prange(first.size - 1):
        for g in range(3):
            low, high = np.inf, -np.inf
            for q in range(first[c], first[c + 1]):
                for h in range(3):
                    low = min(low, triangles[q, h, g])
                    high = max(high, triangles[q, h, g])
            out[c, g], out[c, 3 + g] = low, high
    return out


@njit(cache=True)
def _node_of(i, film, code, own, keys, first_thin, films):
    """A film's node at a sample, its own or one beside a thin part of it; -1 for none."""
    if code[i] == film:
        return np.int64(own[i])
    key = i * films + film
    at = np.searchsorted(keys, key)
    return first_thin + at if at < keys.size and keys[at] == key else -1


@njit(cache=True, parallel=True)
def face_times(
    base_time, triangles, outer, first, cells, corner_offsets, code, own, keys, first_thin, films, place, time, before,
    slowness,
):  # fmt: skip
    """Lower `base_time (triangles, 3)` to when an earlier front gets to each triangle's corners from those of its cell.

    A front comes from the nodes of the film `outer (triangles,)` on the other side, and only from those that it gets to
    sooner than `before (nodes,)`. Triangles lie cell after cell of `cells` from `first`; the front's nodes are at
    `place (nodes, 3)`, by `own (n,)` and the sorted `keys` as in `fronts.link`.
    """
    for c in prange(cells.size):
        nodes = np.empty(8, np.int64)
        film = -1
        for q in range(first[c], first[c + 1]):
            if outer[q] < 0:
                continue
            if outer[q] != film:
                film = np.int64(outer[q])
                for a in range(8):
                    nodes[a] = _node_of(cells[c] + corner_offsets[a], film, code, own, keys, first_thin, films)
            for k in nodes:
                if k < 0 or not time[k] < before[k]:
                    continue
                px, py, pz = np.float64(place[k, 0]), np.float64(place[k, 1]), np.float64(place[k, 2])
                for v in range(3):
                    qx, qy, qz = triangles[q, v, 0], triangles[q, v, 1], triangles[q, v, 2]
                    d = np.sqrt((px - qx) ** 2 + (py - qy) ** 2 + (pz - qz) ** 2)
                    base_time[q, v] = min(base_time[q, v], time[k] + d * slowness[k])


@njit(cache=True)
def sample_reach(cells, partly, shape):
    """How many cells beyond its own a node at each sample looks, `(n,)` int8, by the cells with triangles.

    -1 for not at all, NEAR by such a cell, FAR by one that is partly bare.
    """
    nz, ny, nx = shape
    near = np.full(nz * ny * nx, -1, np.int8)
    for c in range(cells.size):
        base = cells[c]
        z = base // (ny * nx)
        y = (base // nx) % ny
        x = base % nx
        wide = FAR if partly[c] else 0
        mark = FAR if partly[c] else NEAR
        for kz in range(max(z - wide, 0), min(z + 2 + wide, nz)):
            for ky in range(max(y - wide, 0), min(y + 2 + wide, ny)):
                for kx in range(max(x - wide, 0), min(x + 2 + wide, nx)):
                    i = (kz * ny + ky) * nx + kx
                    if near[i] < mark:
                        near[i] = mark
    return near


@njit(cache=True)
def mark_ends(cells, bare_of, cell_mixed, code, corner_offsets, stage, strides, partly):
    """Mark as partly bare those of the cells that have a neighbour, of the same films, that is not numbered."""
    for c in range(cells.size):
        for d in range(6):
            other = cells[c] + (strides[d // 2] if d % 2 else -strides[d // 2])
            if partly[c] or other < 0 or not cell_mixed[other] or bare_of[other] >= 0:
                continue
            for a in range(8):
                k = code[other + corner_offsets[a]]
                if k >= 0 and stage[k]:
                    partly[c] = 1
