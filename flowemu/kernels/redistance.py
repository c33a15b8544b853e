"""Distances made right again away from a surface whose near samples are right already."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
from numba import njit

from flowemu.kernels.march import arrival_on_grid


BOTH = (1, -1)


def redistance(
    field: np.ndarray, dx: float, dy: float, z_centres: np.ndarray, band: float, sides: tuple[int, ...] = BOTH
) -> np.ndarray:
    """Signed distance within a band, from the samples that straddle a crossing.

    Parameters
    ----------
    field : (nz, ny, nx) float32, um
        Negative inside. No NaN.
    dx, dy : float, um
    z_centres : (nz,) um, rising
    band : float, um
    sides : 1 for the positive side, -1 for the negative one; the other keeps its values

    Returns
    -------
    (nz, ny, nx) float32, um
        A sample with a neighbour of the other sign (zero counts as outside) keeps its value to the bit, so no
        crossing moves. Any other within `band` of them has the distance marched from them on its own side. Any
        beyond has its old value if that is no less than the band in magnitude, else the band with its sign.
        Second order: for a sphere of 10 cells' radius right to 0.01 cell on average and 0.06 at most.
    """
    field = np.ascontiguousarray(field, np.float32)
    out = field.copy()
    for side in sides:
        out[(np.abs(field) < band) & ((field < 0) == (side < 0))] = side * np.float32(band)
    planes = _crossed_planes(field)
    if not planes.size:
        return out
    low, high = np.searchsorted(z_centres, [z_centres[planes[0]] - band, z_centres[planes[-1]] + band])
    near = slice(max(0, int(low) - 1), int(high) + 1)
    _redistance_planes(field[near], dx, dy, z_centres[near], band, sides, out[near])
    return out


def _redistance_planes(
    field: np.ndarray,
    dx: float,
    dy: float,
    z_centres: np.ndarray,
    band: float,
    sides: tuple[int, ...],
    out: np.ndarray,
) -> None:
    """The same for a run of planes, into `out`, which holds what goes beyond the band."""
    fixed = _straddling(field)
    out[fixed] = field[fixed]

    def march(sign: int) -> None:
        side = np.float32(sign)
        start, slowness = np.empty_like(field), np.empty_like(field)
        _begin_side(field.reshape(-1), fixed.reshape(-1), side, start.reshape(-1), slowness.reshape(-1))
        distance = arrival_on_grid(start, slowness, dx, dy, z_centres, band)
        _end_side(field.reshape(-1), fixed.reshape(-1), side, distance.reshape(-1), out.reshape(-1))

    with ThreadPoolExecutor(2) as threads:  # either side writes its own samples, and the loops let go of the lock
        list(threads.map(march, sides))


def extend_distance(
    near: np.ndarray,
    open_space: np.ndarray,
    dx: float,
    dy: float,
    z_centres: np.ndarray,
    limit: float,
) -> np.ndarray:
    """Distance through the open space alone, onward from values known near a surface.

    Parameters
    ----------
    near : (nz, ny, nx) float32, um
        Zero or above where known, else +inf; known values stay. Two samples deep gives a second-order start.
    open_space : (nz, ny, nx) bool
        Values elsewhere are not used.
    dx, dy : float, um
    z_centres : (nz,) um, rising
    limit : float, um

    Returns
    -------
    (nz, ny, nx) float32, um
        `near` where that is known; +inf above the limit, where not open and where not reached.
    """
    slowness = np.where(np.isfinite(near) | ~open_space, np.float32(np.inf), np.float32(1))
    return arrival_on_grid(np.where(open_space, near, np.float32(np.nan)), slowness, dx, dy, z_centres, limit)


def _crossed_planes(field: np.ndarray) -> np.ndarray:
    """Numbers of the planes that hold both signs, or another sign than the next plane's or the last one's."""
    inside = (field < 0).reshape(len(field), -1)
    some, full = np.asarray(inside.any(axis=1)), np.asarray(inside.all(axis=1))
    crossed = some & ~full
    changes = some[1:] != some[:-1]
    crossed[1:] |= changes
    crossed[:-1] |= changes
    return np.flatnonzero(crossed)


@njit(cache=True, nogil=True)
def _straddling(field):
    """Samples with one of the six neighbours on the other side, `(nz, ny, nx)` bool."""
    nz, ny, nx = field.shape
    found = np.zeros(field.shape, np.bool_)
    for k in range(nz):
        for j in range(ny):
            for i in range(nx):
                inside = field[k, j, i] < 0.0
                if i > 0 and (field[k, j, i - 1] < 0.0) != inside:
                    found[k, j, i] = found[k, j, i - 1] = True
                if j > 0 and (field[k, j - 1, i] < 0.0) != inside:
                    found[k, j, i] = found[k, j - 1, i] = True
                if k > 0 and (field[k - 1, j, i] < 0.0) != inside:
                    found[k, j, i] = found[k - 1, j, i] = True
    return found


@njit(cache=True, nogil=True)
def _begin_side(field, fixed, side, start, slowness):
    """Starts of one side: straddling samples of both sides are fixed, the other side is blocked."""
    for i in range(field.size):
        own = (field[i] < 0.0) == (side < 0.0)
        start[i] = side * field[i] if fixed[i] else np.inf
        slowness[i] = 1.0 if own and not fixed[i] else np.inf


@njit(cache=True, nogil=True)
def _end_side(field, fixed, side, distance, out):
    """Take over what was marched on one side."""
    for i in range(field.size):
        if (field[i] < 0.0) == (side < 0.0) and distance[i] < np.inf and not fixed[i]:
            out[i] = side * distance[i]
