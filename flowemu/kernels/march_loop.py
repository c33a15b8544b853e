"""The marching loop: second-order upwind arrival times in buckets, on a grid or on a graph of nodes.

One loop serves both: `nbr` is a vector of six strides on a grid and an `(n, 6)` table of node ids on a graph, and
numba compiles each on its own. Directions are ordered -x, +x, -y, +y, -z, +z; `weights` is that of
`march.weights_of`.

A node's time tells its state: NaN is blocked, +inf not reached, anything below the end of the current bucket may be
used by the neighbours. Times are never raised. A node lies in the bucket of its time; entries that it left in later
buckets no longer match its time and are skipped. The buckets form a circle; times beyond it wait in one far list.
The pool of entries `(m, 2)`, each the next entry and a node, grows with the front and not with the grid.

The kernels take plain arrays, and the one called for every node is inlined: counting references to a named tuple's
arrays made the loop five times slower, and to a call's arguments half as slow again.

References
----------
J. A. Sethian, A fast marching level set method for monotonically advancing fronts, PNAS 93 (1996) 1591,
doi:10.1073/pnas.93.4.1591.
L. Yatziv, A. Bartesaghi, G. Sapiro, O(N) implementation of the fast marching algorithm, J. Comput. Phys. 212 (2006)
393, doi:10.1016/j.jcp.2005.08.005.
"""

from __future__ import annotations

import numpy as np
from numba import njit

BUCKET = 0.05
"""Width of a bucket, in smallest spacings times smallest slowness."""
SAME = 0.1
"""Share by which the slowness of two nodes may differ and the front still be taken as smooth across them."""
MAX_BUCKETS = 1 << 16
"""Buckets of the circle at most; later times wait in the far list."""
LAST = 1e15
"""Bucket number that no time exceeds."""
CURRENT, WAITING, SPARE, USED, FAR, FAR_BUCKET = range(6)
"""Places in the queue's state: bucket in hand, entries in the circle, spare list, entries ever used, far list."""


def march(
    time: np.ndarray,
    slowness: np.ndarray,
    nbr: np.ndarray,
    plane: np.ndarray,
    weights: np.ndarray,
    limit: float,
    seeds: np.ndarray | None = None,
) -> None:
    """Lower `time` to the arrival times; those above `limit` are not final.

    Parameters
    ----------
    time : (n,) float32, s
        Starts, +inf where not known, NaN where blocked. Nodes are so ordered or padded that a blocked one lies
        wherever a neighbour is missing; -1 reads the last node.
    slowness : (n,) or (1,) float32, s/um
        +inf blocks a node without a start and makes one with a start a fixed source.
    nbr, plane : (6,) strides and (1,) size of a plane, or (n, 6) ids and (n,) plane of each node
    weights : (planes, 6, 4) float64
    limit : float, s
    seeds : (m,) int
        Nodes to begin from; all with a start if left out.

    Raises
    ------
    ValueError
        A slowness is zero or below.

    Notes
    -----
    The kernel stops when the pool of entries is full, and goes on with one of twice the size. Buckets are looked at
    one by one, so the range of times counts: a thousand million widths take about a second.
    """
    finite = slowness[np.isfinite(slowness)]
    if not finite.size:
        return
    if finite.min() <= 0:
        raise ValueError("slowness must be above zero")
    if slowness.size > 1:
        closed = np.isinf(slowness)
        time[closed & np.isinf(time)] = np.nan
        if finite.min() == finite.max() and not np.any(time[closed] < np.inf):
            slowness = finite[:1]
    per_second = 1.0 / (BUCKET * weights[:, :, 0].min() * float(finite.min()))
    span = weights[:, :, 0].max() * float(finite.max()) * per_second + 3.0
    heads = np.full(1 << int(np.ceil(np.log2(min(span, MAX_BUCKETS)))), -1, np.int32)
    seeds = np.flatnonzero(time < np.inf) if seeds is None else seeds
    pool = np.empty((len(seeds) + 4096, 2), np.int32)
    state = np.array([0, 0, -1, 0, -1, int(LAST)])
    with np.errstate(invalid="ignore", over="ignore", divide="ignore"):  # for runs without the compiler
        _fill(seeds, time, heads, pool, state, per_second)
        while not _run(time, nbr, plane, weights, slowness, heads, pool, state, per_second, float(limit)):
            pool = np.concatenate([pool, np.empty_like(pool)])


@njit(cache=True, error_model="numpy", forceinline=True)
def _bucket(t, per_second):
    return np.int64(min(np.float64(t) * per_second, LAST))


@njit(cache=True, error_model="numpy", forceinline=True)
def _hop(nbr, i, d):
    if nbr.ndim == 1:
        return i + nbr[d]
    else:
        return np.int64(nbr[i, d])


@njit(cache=True, error_model="numpy", forceinline=True)
def _plane_beside(nbr, plane, k, j, d):
    """Plane of node j, which lies in direction d of a node of plane k."""
    if nbr.ndim == 1:
        return k + (d == 5) - (d == 4)
    else:
        return np.int64(plane[j])


@njit(cache=True, error_model="numpy", forceinline=True)
def _alike(slowness, slow):
    """Whether a front that came at the one slowness goes on at the other; a fixed source's is infinite."""
    return (slowness >= slow * (1.0 - SAME)) & ((slowness <= slow * (1.0 + SAME)) | (slowness == np.inf))


@njit(cache=True, error_model="numpy", forceinline=True)
def _upwind(time, front, nbr, weights, slowness, i, k, d, slow):
    """Weight and foot of one axis in `sum of weight (t - foot)^2 = slow^2`, and whether a smooth front comes along it.

    The weight is 0 if nothing is usable. Second order needs two accepted nodes upwind, of node i's slowness: across
    a step in slowness it would give node i up to a third of the step's time too early.
    """
    each = np.int64(slowness.size > 1)
    below = _hop(nbr, i, d)
    above = _hop(nbr, i, d + 1)
    a = np.float64(time[below]) if time[below] < front else np.inf
    b = np.float64(time[above]) if time[above] < front else np.inf
    down = a + slow * weights[k, d, 0] <= b + slow * weights[k, d + 1, 0]
    first = a if down else b
    j = below if down else above
    e = d if down else d + 1
    jj = _hop(nbr, j, e)
    second = np.float64(time[jj])
    curved = (second <= first) & _alike(slowness[j * each], slow) & _alike(slowness[jj * each], slow)
    weight = weights[k, e, 1 + np.int64(curved)]
    foot = first + weights[k, e, 3] * (first - (second if curved else first))
    usable = first < np.inf
    smooth = curved & usable & (first - second > 0.5 * slow * weights[k, e, 0])
    return (weight if usable else 0.0), (foot if usable else 0.0), smooth


@njit(cache=True, error_model="numpy", forceinline=True)
def _meet(wx, x, wy, y, wz, z, slow):
    """Time at which a front with these weights and feet passes; an axis whose foot is later still is left out."""
    while wx * wy + wy * wz + wz * wx > 0.0:
        w = wx + wy + wz
        b = wx * x + wy * y + wz * z
        c = wx * x * x + wy * y * y + wz * z * z - slow * slow
        last = max(x if wx > 0.0 else -np.inf, y if wy > 0.0 else -np.inf, z if wz > 0.0 else -np.inf)
        root = b * b - w * c
        if root >= 0.0:
            t = (b + np.sqrt(root)) / w
            if t >= last:
                return t
        if wx > 0.0 and x == last:
            wx = 0.0
        elif wy > 0.0 and y == last:
            wy = 0.0
        else:
            wz = 0.0
    foot = x if wx > 0.0 else (y if wy > 0.0 else z)
    return foot + slow / np.sqrt(wx + wy + wz)


@njit(cache=True, error_model="numpy")
def _round_corner(time, front, nbr, weights, slowness, i, k, d, slow):
    """Time in direction d of node i straight from the neighbours of i across it; +inf if none is usable.

    That is the way of a front round an obstacle's edge and from a point, where no axis has a second-order slope of half
    the slowness or more and the axes alone come late by up to 0.59 of a cell. No plane front comes later than the
    straight way.
    """
    each = np.int64(slowness.size > 1)
    soonest = np.inf
    for e in range(6):
        if e // 2 != d // 2 and _alike(slowness[i * each], slow):
            m = _hop(nbr, i, e)
            if time[m] < front and _alike(slowness[m * each], slow):
                way = np.sqrt(weights[k, d ^ 1, 0] ** 2 + weights[k, e, 0] ** 2)
                soonest = min(soonest, time[m] + slow * way)
    return soonest


@njit(cache=True, error_model="numpy", forceinline=True)
def _put(heads, pool, state, bucket, i):
    """Enter node i; a bucket already passed becomes the current one, marked by the complement of the node."""
    e = state[SPARE]
    if e >= 0:
        state[SPARE] = pool[e, 0]
    else:
        e = state[USED]
        state[USED] = e + 1
    if bucket < state[CURRENT]:
        bucket = state[CURRENT]
        i = ~i
    pool[e, 1] = i
    if bucket - state[CURRENT] < heads.size:
        s = bucket & (heads.size - 1)
        pool[e, 0] = heads[s]
        heads[s] = e
        state[WAITING] += 1
    else:
        pool[e, 0] = state[FAR]
        state[FAR] = e
        state[FAR_BUCKET] = min(state[FAR_BUCKET], bucket)


@njit(cache=True, error_model="numpy", forceinline=True)
def _pass_on(time, front, nbr, plane, weights, slowness, heads, pool, state, per_second, i):
    """Lower the times of the neighbours of node i that come after it."""
    t = np.float64(time[i])
    each = np.int64(slowness.size > 1)
    k = i // plane[0] if nbr.ndim == 1 else np.int64(0)
    for d in range(6):
        j = _hop(nbr, i, d)
        old = time[j]
        if not old > t:
            continue
        kj = _plane_beside(nbr, plane, k, j, d)
        slow = np.float64(slowness[j * each])
        wx, x, cx = _upwind(time, front, nbr, weights, slowness, j, kj, 0, slow)
        wy, y, cy = _upwind(time, front, nbr, weights, slowness, j, kj, 2, slow)
        wz, z, cz = _upwind(time, front, nbr, weights, slowness, j, kj, 4, slow)
        new = np.float32(t + _meet(wx, x - t, wy, y - t, wz, z - t, slow))
        if not (cx | cy | cz):
            new = min(new, np.float32(_round_corner(time, front, nbr, weights, slowness, i, kj, d, slow)))
        if new < old:
            time[j] = new
            bucket = _bucket(new, per_second)
            if old == np.inf or bucket < _bucket(old, per_second):
                _put(heads, pool, state, bucket, j)


@njit(cache=True, error_model="numpy")
def _bring_near(time, heads, pool, state, per_second):
    """Enter the nodes of the far list anew."""
    e = state[FAR]
    state[FAR] = -1
    state[FAR_BUCKET] = np.int64(LAST)
    while e >= 0:
        following = np.int64(pool[e, 0])
        i = np.int64(pool[e, 1])
        pool[e, 0] = state[SPARE]
        state[SPARE] = e
        _put(heads, pool, state, _bucket(time[i], per_second), i)
        e = following


@njit(cache=True, error_model="numpy")
def _empty_bucket(time, nbr, plane, weights, slowness, heads, pool, state, per_second):
    """Handle the current bucket to its end; False if the pool must grow first."""
    s = state[CURRENT] & (heads.size - 1)
    front = (state[CURRENT] + 1) / per_second * (1.0 + 1e-12)
    while heads[s] >= 0:
        if state[USED] + 6 > len(pool):
            return False
        e = heads[s]
        heads[s] = pool[e, 0]
        pool[e, 0] = state[SPARE]
        state[SPARE] = e
        state[WAITING] -= 1
        i = np.int64(pool[e, 1])
        if i < 0:
            _pass_on(time, front, nbr, plane, weights, slowness, heads, pool, state, per_second, ~i)
        elif _bucket(time[i], per_second) == state[CURRENT]:
            _pass_on(time, front, nbr, plane, weights, slowness, heads, pool, state, per_second, i)
    return True


@njit(cache=True, error_model="numpy", nogil=True)
def _run(time, nbr, plane, weights, slowness, heads, pool, state, per_second, limit):
    """March until no node waits or the limit is passed; False if the pool must grow first."""
    last = limit * per_second
    while state[WAITING] > 0 or state[FAR] >= 0:
        if state[WAITING] == 0:
            state[CURRENT] = max(state[CURRENT], state[FAR_BUCKET])
        if state[CURRENT] > last:
            return True
        if state[CURRENT] >= state[FAR_BUCKET]:
            _bring_near(time, heads, pool, state, per_second)
        if not _empty_bucket(time, nbr, plane, weights, slowness, heads, pool, state, per_second):
            return False
        state[CURRENT] += 1
    return True


@njit(cache=True, error_model="numpy")
def _fill(seeds, time, heads, pool, state, per_second):
    """Enter the nodes to begin from."""
    for i in seeds:
        _put(heads, pool, state, _bucket(time[i], per_second), i)
