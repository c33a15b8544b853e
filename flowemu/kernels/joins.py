"""What hangs together: samples and intervals of edges (see `kernels.regions`) joined into pieces and bodies.

The members of a union-find are the samples, in flat order, and after them the intervals of the edges.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from flowemu.kernels.regions import EDGE_STEPS, STEP_OF_BITS, TETRAHEDRA


@njit(cache=True)
def find(parent, i):
    """Root of `i`, halving the path on the way."""
    while parent[i] != i:
        parent[i] = parent[parent[i]]
        i = parent[i]
    return i


@njit(cache=True)
def unite(parent, i, j):
    """Put `i` and `j` into one set; the lower root stays, so the result knows no order."""
    a = find(parent, i)
    b = find(parent, j)
    if a < b:
        parent[b] = a
    elif b < a:
        parent[a] = b


@njit(cache=True)
def join_samples(code, extra):
    """Union-find parents of all samples joined with their like axis neighbours, and `extra` more."""
    nz, ny, nx = code.shape
    n = nz * ny * nx
    parent = np.empty(n + extra, np.int32)
    i = 0
    for z in range(nz):
        for y in range(ny):
            for x in range(nx):
                c = code[z, y, x]
                parent[i] = i
                if x > 0 and code[z, y, x - 1] == c:
                    parent[i] = parent[i - 1]
                if y > 0 and code[z, y - 1, x] == c:
                    if not (x > 0 and code[z, y - 1, x - 1] == c and code[z, y, x - 1] == c):
                        unite(parent, i, i - nx)
                if z > 0 and code[z - 1, y, x] == c:
                    if not (x > 0 and code[z - 1, y, x - 1] == c and code[z, y, x - 1] == c):
                        unite(parent, i, i - ny * nx)
                i += 1
    for j in range(n, n + extra):
        parent[j] = j
    return parent


@njit(cache=True)
def join_edges(parent, samples, code, strides, shape, count, start, interval_code):
    """Join like samples across diagonals, and voids that abut along an edge."""
    n = code.size
    nz, ny, nx = shape
    for s in range(samples.size):
        i = samples[s]
        z = i // (ny * nx)
        y = (i // nx) % ny
        x = i % nx
        for d in range(7):
            if z + EDGE_STEPS[d, 0] >= nz or y + EDGE_STEPS[d, 1] >= ny or x + EDGE_STEPS[d, 2] >= nx:
                continue
            j = i + strides[d]
            if d > 2 and code[i] == code[j]:
                unite(parent, i, j)
            at = start[s * 7 + d]
            last = np.int64(count[s, d]) - 1
            for q in range(last):
                if interval_code[at + q] < 0 and interval_code[at + q + 1] < 0:
                    a = i if q == 0 else n + at + q
                    b = j if q + 1 == last else n + at + q + 1
                    unite(parent, a, b)


@njit(cache=True)
def join_thin(parent, cells, row_of, code, count, start, interval_code, corner_offsets):
    """Join the intervals inside edges with their like in each tetrahedron of the mixed cells."""
    n = code.size
    node = np.empty(64, np.int64)
    kind = np.empty(64, np.int64)
    for c in range(cells.size):
        base = cells[c]
        thin = False
        for a in range(7):
            s = row_of[base + corner_offsets[a]]
            if s >= 0:
                for b in range(a + 1, 8):
                    if (a & b) == a and count[s, STEP_OF_BITS[b - a]] > 2:
                        thin = True
        if not thin:
            continue
        for t in range(6):
            m = 0
            for a in range(4):
                i = base + corner_offsets[TETRAHEDRA[t, a]]
                node[m] = i
                kind[m] = code[i]
                m += 1
                s = row_of[i]
                for b in range(a + 1, 4):
                    d = STEP_OF_BITS[TETRAHEDRA[t, b] - TETRAHEDRA[t, a]]
                    at = start[s * 7 + d]
                    for q in range(1, np.int64(count[s, d]) - 1):
                        if m < 60:
                            node[m] = n + at + q
                            kind[m] = interval_code[at + q]
                            m += 1
            for p in range(m):
                for q in range(p):
                    if kind[p] == kind[q]:
                        unite(parent, node[p], node[q])


@njit(cache=True)
def join_contacts(parent, samples, code, strides, count, start, interval_code):
    """Join solids that abut along an edge (the pieces become bodies)."""
    n = code.size
    for s in range(samples.size):
        i = samples[s]
        for d in range(7):
            at = start[s * 7 + d]
            last = np.int64(count[s, d]) - 1
            for q in range(last):
                if interval_code[at + q] >= 0 and interval_code[at + q + 1] >= 0:
                    a = i if q == 0 else n + at + q
                    b = i + strides[d] if q + 1 == last else n + at + q + 1
                    unite(parent, a, b)


@njit(cache=True)
def flatten(parent):
    """Every member's root, `(n,)` int32."""
    for i in range(parent.size):
        parent[i] = parent[parent[i]]
    return parent
