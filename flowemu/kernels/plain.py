"""Etch starts where nothing but one smooth face lies bare: there the film's own field is the distance.

A cell is plain if it holds one film and open voids, and one of the film's fields alone changes sign in it. Far from all
other cells with a bare face, and from where the bare face ends, its samples need no triangles.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from flowemu.kernels.contents import OPEN_VOID


@njit(cache=True, parallel=True)
def plain_fields(cells, found, corner_offsets, row_of, values, code, ti, bi, gi, stage, is_open, piece):
    """The one field that changes sign in each cell, `(cells,)` int64, -1 where the cell is not plain.

    `found (cells,)` is what reaches into each, of `contents.contents`.
    """
    out = np.full(cells.size, -1, np.int64)
    for c in prange(cells.size):
        film = np.int64(-1)
        one = found[c] & (found[c] - np.uint64(1)) == OPEN_VOID  # one bit beside the void's
        for a in range(8):
            i = cells[c] + corner_offsets[a]
            if code[i] >= 0:
                film = np.int64(code[i])
            else:
                one &= is_open[piece[i]] != 0
        if one and film >= 0 and stage[film] != 0:
            out[c] = _cut_field(cells[c], corner_offsets, row_of, values, ti[film], bi[film], gi[film])
    return out


@njit(cache=True)
def _cut_field(cell, corner_offsets, row_of, values, top, floor, gone):
    """Which of a film's three fields changes sign between a cell's corners, -1 if it is not one alone."""
    found = -1
    for f in (top, floor, gone):
        below = 0
        for a in range(8):
            below += f >= 0 and values[row_of[cell + corner_offsets[a]], f] < 0
        if 0 < below < 8:
            if found >= 0:
                return -1
            found = f
    return found


@njit(cache=True)
def mark_around(cells, shape, wide, out):
    """Mark in `out`, flat bool over the samples, the cells within `wide` of these."""
    nz, ny, nx = shape
    for c in cells:
        z, y, x = c // (ny * nx), (c // nx) % ny, c % nx
        for kz in range(max(z - wide, 0), min(z + wide + 1, nz)):
            for ky in range(max(y - wide, 0), min(y + wide + 1, ny)):
                row = (kz * ny + ky) * nx
                out[row + max(x - wide, 0) : row + min(x + wide + 1, nx)] = True


@njit(cache=True)
def field_starts(cells, field, code, own, slowness, shape, time):
    """Lower `time` of the film's nodes at and one sample beyond the corners of plain cells of one field."""
    nz, ny, nx = shape
    for c in cells:
        z, y, x = c // (ny * nx), (c // nx) % ny, c % nx
        film = -1
        for kz in range(z, z + 2):
            for ky in range(y, y + 2):
                for kx in range(x, x + 2):
                    film = max(film, code[(kz * ny + ky) * nx + kx])
        for kz in range(max(z - 1, 0), min(z + 3, nz)):
            for ky in range(max(y - 1, 0), min(y + 3, ny)):
                for kx in range(max(x - 1, 0), min(x + 3, nx)):
                    i = (kz * ny + ky) * nx + kx
                    if code[i] == film:
                        a = own[i]
                        time[a] = min(time[a], abs(field[i]) * slowness[a])
