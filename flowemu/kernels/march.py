"""Arrival times of a front on a grid with graded z planes, or on a graph of nodes."""

from __future__ import annotations

import numpy as np

from flowemu.kernels.march_loop import march


def arrival_on_grid(
    start: np.ndarray,
    slowness: np.ndarray | float,
    dx: float,
    dy: float,
    z_centres: np.ndarray,
    limit: float = np.inf,
) -> np.ndarray:
    """First arrival of a front at every sample of a grid; the grid's sides are mirrors.

    Parameters
    ----------
    start : (nz, ny, nx), s
        +inf where not known, NaN where blocked. A finite value is lowered where the front comes sooner, or
        stands as a fixed source (below zero too) where the slowness is infinite.
    slowness : (nz, ny, nx) or float, s/um
        Above zero. A sample of infinite slowness is blocked if its start is not finite.
    dx, dy : float, um
    z_centres : (nz,) um, rising
    limit : float, s
        Times above it come out as +inf. To interpolate a front at t, pass t plus two spacings times the slowness.

    Returns
    -------
    (nz, ny, nx) float32, s
        +inf where blocked or not reached. Second order: from a sphere of 5 cells' radius right to 0.04 cell on
        average and 0.11 at most over 60 cells; round an obstacle's edge 0.07 and 0.25, from a point 0.15 and 0.35,
        on either side; a plane front along an axis is exact, graded z included.
    """
    start = np.asarray(start, np.float32)
    slow = np.asarray(slowness, np.float32)
    out = np.full(start.shape, np.float32(np.inf))
    if slow.min(initial=np.inf) <= 0:
        raise ValueError("slowness must be above zero")
    axes = (z_centres, dy * np.arange(start.shape[1]), dx * np.arange(start.shape[2]))
    box = _reach(start, float(slow.min(initial=np.inf)), axes, limit)
    if box is None:
        return out
    start, core = start[box], np.s_[1:-1, :-1, :-1]
    nz, ny, nx = start.shape
    padded = (nz + 2, ny + 1, nx + 1)
    time = np.full(padded, np.float32(np.nan))
    time[core] = start
    if slow.ndim > 0:
        slow_padded = np.full(padded, np.float32(np.inf))
        slow_padded[core] = slow[box]
        slow = slow_padded
    plane = padded[1] * padded[2]
    strides = np.array([-1, 1, -padded[2], padded[2], -plane, plane])
    weights = np.pad(weights_of(dx, dy, z_centres[box[0]]), ((1, 1), (0, 0), (0, 0)), "edge")
    march(time.reshape(-1), slow.reshape(-1), strides, np.array([plane]), weights, limit)
    out[box] = np.where(time[core] <= limit, time[core], np.inf)
    return out


def arrival_on_graph(
    start: np.ndarray,
    slowness: np.ndarray,
    nbr: np.ndarray,
    zi: np.ndarray,
    dx: float,
    dy: float,
    z_centres: np.ndarray,
    limit: float = np.inf,
    seeds: np.ndarray | None = None,
) -> np.ndarray:
    """First arrival at the nodes of a graph; all as for `arrival_on_grid`, and each node has one plane `zi`.

    Parameters
    ----------
    start, slowness : (n,) s and s/um
    nbr : (n, 6) int32
        Node across each side, -1 for none. A last row of -1 more than there are nodes saves a copy.
    zi : (n,) int
        Index into `z_centres`.
    seeds : (m,) int
        Where `start` is an earlier result but for some nodes that a front now reaches sooner, these nodes.

    Returns
    -------
    (n,) float32, s
    """
    time = np.append(start, np.nan).astype(np.float32)  # the last one is what a neighbour of -1 reads
    slow = np.append(slowness, np.inf).astype(np.float32)
    plane = np.append(zi, 0).astype(np.int32)
    if len(nbr) == len(start):
        nbr = np.vstack([nbr, np.full((1, 6), -1)]).astype(np.int32)
    march(time, slow, nbr, plane, weights_of(dx, dy, z_centres), limit, seeds)
    return np.where(time <= limit, time, np.float32(np.inf))[:-1]


def weights_of(dx: float, dy: float, z_centres: np.ndarray) -> np.ndarray:
    """Stencil of every plane and direction, `(nz, 6, 4)` float64.

    With a and b the two spacings in that direction: a, the first-order weight 1 / a^2, the second-order weight
    ((2a + b) / (a (a + b)))^2, and the share c of the foot value T1 + c (T1 - T2).
    """
    gap = np.diff(z_centres) if len(z_centres) > 1 else np.array([dx])
    gap = np.pad(np.asarray(gap, np.float64), 2, "edge")
    k = np.arange(len(z_centres))
    across = [(np.full(len(k), d), np.full(len(k), d)) for d in (dx, dx, dy, dy)]
    weights = np.empty((len(k), 6, 4))
    for d, (a, b) in enumerate([*across, (gap[k + 1], gap[k]), (gap[k + 2], gap[np.minimum(k + 3, len(gap) - 1)])]):
        slope = (2 * a + b) / (a * (a + b))
        weights[:, d] = np.stack([a, a**-2.0, slope**2, a / (b * (a + b)) / slope], axis=1)
    return weights


def _reach(start: np.ndarray, slowness: float, axes: tuple, limit: float) -> tuple[slice, slice, slice] | None:
    """Box that a front at `slowness` can fill by the limit; None if nothing starts."""
    known = start < np.inf
    if not known.any():
        return None
    if not np.isfinite(limit):
        return np.s_[:, :, :]
    far = max(0.0, limit - float(start[known].min())) / slowness
    box = []
    for axis, centres in enumerate(axes):
        at = np.flatnonzero(known.any(axis=tuple({0, 1, 2} - {axis})))
        low, high = np.searchsorted(centres, [centres[at[0]] - far, centres[at[-1]] + far])
        box.append(slice(max(0, int(low) - 1), int(high) + 1))
    return box[0], box[1], box[2]
