"""Where an etch front can go: nodes and their links.

A node is a (sample, film) pair. A film's own samples are nodes; a sample just outside is one too where the film is so
thin there that it holds at most one sample across, so that fronts run along films of any thickness. Nodes link within
their film, and to those of a film of the same medium, etched at the same rate, where the two touch on an edge; else
fronts pass from film to film through the faces between them (`kernels.starts`).

`stage[code]` is 1 for the films that are etched, 0 for the rest; `medium[code]` is the first film of the same rate.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange


@njit(cache=True, parallel=True)
def own_samples(code, stage):
    """Flat numbers of the samples in staged films, rising, and the place of every sample among them, -1 for none."""
    nz, ny, nx = code.shape
    number = np.zeros(nz + 1, np.int64)
    for plane in prange(nz):
        z = np.int64(plane)
        for y in range(ny):
            for x in range(nx):
                number[z + 1] += code[z, y, x] >= 0 and stage[code[z, y, x]] != 0
    first = np.cumsum(number)
    out = np.empty(first[nz], np.int64)
    own = np.full(nz * ny * nx, -1, np.int32)
    for plane in prange(nz):
        z = np.int64(plane)
        k = first[z]
        for y in range(ny):
            for x in range(nx):
                if code[z, y, x] >= 0 and stage[code[z, y, x]] != 0:
                    i = (z * ny + y) * nx + x
                    out[k] = i
                    own[i] = k
                    k += 1
    return out, own


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
            size += 2 * np.int64(count[s, d])
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
def _beyond_contact(i, j, k, d, up, medium, code, row_of, count, start, interval_code):
    """The film of `k`'s medium that `k` touches towards j on the edge i-j, -1 for none, and whether it reaches j."""
    low = i if up else j
    s = row_of[low]
    n = np.int64(count[s, d]) if s >= 0 else 0
    at = start[s * 7 + d] if n > 0 else 0
    for p in range(n):
        q = p if up else n - 1 - p
        following = q + 1 if up else q - 1
        if interval_code[at + q] == k and 0 <= following < n:
            c = np.int64(interval_code[at + following])
            if c >= 0 and c != k and medium[c] == medium[k]:
                return c, p == n - 2 and c == code[j]
            return -1, False
    return -1, False


@njit(cache=True, parallel=True)
def link(node_sample, node_film, own, keys, first_thin, code, medium, shape, row_of, count, start, interval_code):
    """Neighbours of the nodes in the order -x, +x, -y, +y, -z, +z, `(n + 1, 6)` int32; -1: none, as in the last row."""
    nz, ny, nx = shape
    films = medium.size
    nbr = np.full((node_sample.size + 1, 6), -1, np.int32)
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
            if code[j] == m and code[i] == m:
                nbr[a, k] = own[j]
                continue
            if row_of[j] < 0:
                continue
            c, reaches = _beyond_contact(i, j, m, d, up, medium, code, row_of, count, start, interval_code)
            if reaches:
                nbr[a, k] = own[j]
                continue
            p = lookup(keys, j * films + c) if c >= 0 else -1
            if p < 0 and code[j] == m:
                nbr[a, k] = own[j]
                continue
            if p < 0:
                p = lookup(keys, j * films + m)
            if p >= 0:
                nbr[a, k] = first_thin + p
    return nbr


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
def foot_times(samples, strides, count, start, interval_code, interval_end, film, below, time):
    """Where `film` has its foot on a vertical edge: the samples below, and the time there between those of the ends.

    With `below` from 0 on only where it stands on that film. `time (n,)` may be inf at one of the ends.
    """
    sample = np.empty(samples.size, np.int64)
    at_foot = np.empty(samples.size, np.float64)
    m = 0
    for s in range(samples.size):
        at = start[s * 7 + 2]
        for q in range(1, np.int64(count[s, 2])):
            under = interval_code[at + q - 1]
            if interval_code[at + q] != film or under == film or (below >= 0 and under != below):
                continue
            low, high = np.float64(time[samples[s]]), np.float64(time[samples[s] + strides[2]])
            share = interval_end[at + q - 1]
            sample[m] = samples[s]
            at_foot[m] = low + share * (high - low) if max(low, high) < np.inf else min(low, high)
            m += 1
            break
    return sample[:m], at_foot[:m]


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
