"""Where an etch front starts: exact distances of nodes from the bare faces of films.

Every node near a bare face takes the least distance to all of its triangles in reach. Where a face
ends under a cover the reach is longer, as no difference scheme can follow a front round a corner from
its first samples.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

NEAR = 1  # cells beyond its own from which a node looks for faces
FAR = 3  # the same where a face ends under a cover
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
def _closest(px, py, pz, t):
    """The point of the triangle t, `(3, 3)`, closest to a point."""
    ax, ay, az = t[0, 0], t[0, 1], t[0, 2]
    ux, uy, uz = t[1, 0] - ax, t[1, 1] - ay, t[1, 2] - az
    vx, vy, vz = t[2, 0] - ax, t[2, 1] - ay, t[2, 2] - az
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
def _sees(px, py, pz, qx, qy, qz, film, code, cell_row, row_of, values, ti, bi, gi, shape, zc, dx, dy, mid):
    """Whether the straight line from p to the face at q runs through the film, or void, alone.

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
        if cell_row[base] >= 0:
            wx, wy, wz = fx - x, fy - y, (at - zc[z]) / (zc[z + 1] - zc[z])
            mid[:] = 0.0
            for a in range(8):
                w = (wx if a & 1 else 1 - wx) * (wy if a & 2 else 1 - wy) * (wz if a & 4 else 1 - wz)
                r = row_of[base + (a & 1) + ((a >> 1) & 1) * nx + (a >> 2) * ny * nx]
                for f in range(mid.size):
                    mid[f] += w * values[r, f]
            here = _code_of(mid, ti, bi, gi)
        if here >= 0 and here != film:
            return False
    return True


@njit(cache=True)
def _least_way(x, y, z, cx, cy, cz, zc, dx, dy):
    """A lower bound of the distance from a sample's surroundings (one cell) to a cell."""
    ax = max(cx - x, x - cx - 1, 0) * dx
    ay = max(cy - y, y - cy - 1, 0) * dy
    az = max(zc[cz] - zc[z], zc[z] - zc[cz + 1], 0.0)
    return max(np.sqrt(ax * ax + ay * ay + az * az) - max(dx, dy), 0.0)


@njit(cache=True, parallel=True)
def nearest_starts(
    nodes, node_sample, node_film, place, reach, cell_row, first, triangles, films_of, base_time, slowness,
    code, row_of, values, ti, bi, gi, shape, zc, dx, dy, time, beyond,
):  # fmt: skip
    """Lower `time` of the listed nodes to the earliest start at a bare triangle within reach.

    A start is the triangle's `base_time (triangles,)` plus the distance times the node's slowness;
    `reach (listed,)` is in cells. `beyond` takes how much farther, um, a front that comes across a
    thin film has to go from the node's place to its sample.
    """
    nz, ny, nx = shape
    for k in prange(nodes.size):
        a = nodes[k]
        film = node_film[a]
        i = node_sample[a]
        z = i // (ny * nx)
        y = (i // nx) % ny
        x = i % nx
        px, py, pz = np.float64(place[a, 0]), np.float64(place[a, 1]), np.float64(place[a, 2])
        away_x, away_y, away_z = x * dx - px, y * dy - py, zc[z] - pz
        length = np.sqrt(away_x * away_x + away_y * away_y + away_z * away_z)
        best = time[a]
        along = beyond[a]
        mid = np.empty(values.shape[1], np.float64)
        for turn in range(2):  # the cells that touch the sample come first, so that most others can be passed by
            r = np.int64(reach[k]) if turn == 1 else 0
            if turn == 1 and r == 0:
                continue
            for cz in range(max(z - 1 - r, 0), min(z + 1 + r, nz - 1)):
                for cy in range(max(y - 1 - r, 0), min(y + 1 + r, ny - 1)):
                    for cx in range(max(x - 1 - r, 0), min(x + 1 + r, nx - 1)):
                        c = cell_row[(cz * ny + cy) * nx + cx]
                        if c < 0 or first[c] == first[c + 1]:
                            continue
                        touches = z - 1 <= cz <= z and y - 1 <= cy <= y and x - 1 <= cx <= x
                        if turn == 1 and (touches or _least_way(x, y, z, cx, cy, cz, zc, dx, dy) * slowness[a] >= best):
                            continue
                        for q in range(first[c], first[c + 1]):
                            if films_of[q] != film:
                                continue
                            qx, qy, qz = _closest(px, py, pz, triangles[q])
                            rx, ry, rz = px - qx, py - qy, pz - qz
                            d = np.sqrt(rx * rx + ry * ry + rz * rz)
                            start = base_time[q] + d * slowness[a]
                            if start >= best:
                                continue
                            if turn == 1 and not _sees(
                                px, py, pz, qx, qy, qz, film, code, cell_row, row_of, values, ti, bi, gi, shape,
                                zc, dx, dy, mid,
                            ):
                                continue
                            best = start
                            further = (rx * away_x + ry * away_y + rz * away_z) / max(d, 1e-9)
                            along = further if abs(further) > HEAD_ON * length else 0.0
        time[a] = best
        beyond[a] = along


@njit(cache=True, parallel=True)
def face_times(triangles, cell_of, cells, corner_offsets, shape, code, source, node_of, time, slowness, zc, dx, dy):
    """When an earlier front gets to each triangle, `(triangles,)`: from the corners of its cell in a source film.

    `node_of (n,)` gives the front's node of a sample's own film, -1 for none.
    """
    _, ny, nx = shape
    offset = source.size // 2
    out = np.full(triangles.shape[0], np.inf)
    for q in prange(triangles.shape[0]):
        base = cells[cell_of[q]]
        for a in range(8):
            i = base + corner_offsets[a]
            if code[i] < 0 or source[code[i] + offset] == 0 or node_of[i] < 0:
                continue
            px, py, pz = (i % nx) * dx, ((i // nx) % ny) * dy, zc[i // (ny * nx)]
            qx, qy, qz = _closest(px, py, pz, triangles[q])
            d = np.sqrt((px - qx) ** 2 + (py - qy) ** 2 + (pz - qz) ** 2)
            out[q] = min(out[q], time[node_of[i]] + d * slowness[node_of[i]])
    return out


@njit(cache=True)
def reach_of_nodes(node_sample, node_film, cells, cell_number, partly, shape, films, node_reach):
    """How many cells beyond its own each node looks: -1 not at all, NEAR by a bare cell, FAR by a partly bare one.

    Fills `node_reach (nodes,)` int8 by way of the samples near bare cells.
    """
    nz, ny, nx = shape
    near = np.full(nz * ny * nx, -1, np.int8)
    for c in range(cells.size):
        if cell_number[c] == 0:
            continue
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
    for a in range(node_sample.size):
        node_reach[a] = near[node_sample[a]]
