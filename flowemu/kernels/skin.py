"""How shallow a cut is."""

from __future__ import annotations

import numpy as np
from numba import njit, prange


@njit(cache=True, parallel=True)
def skims(top, floor, has_floor, removed, near, most, share):
    """Whether a removed field takes nowhere `most` um or more off a film's top, nor `share` of its thickness.

    Looked at are the samples of the three fields `(nz, ny, nx)` within `near` um of the top, where the film is.
    """
    nz, ny, nx = top.shape
    shallow = np.ones(nz, np.bool_)
    for plane in prange(nz):
        z = np.int64(plane)
        for y in range(ny):
            if not shallow[z]:
                break
            for x in range(nx):
                t = top[z, y, x]
                if abs(t) >= near or (has_floor and floor[z, y, x] <= t):
                    continue
                limit = min(most, share * (floor[z, y, x] - t)) if has_floor else most
                if removed[z, y, x] - t >= limit:
                    shallow[z] = False
    return shallow.all()
