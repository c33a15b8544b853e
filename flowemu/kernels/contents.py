"""What reaches into each mixed cell (see `kernels.regions`), as bits, so that most cells can be passed by."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from flowemu.kernels.regions import STEP_OF_BITS

OPEN_VOID = np.uint64(1 << 63)
"""The bit of an open void; film k has bit k % 63."""


@njit(cache=True, parallel=True)
def contents(cells, corner_offsets, row_of, code, count, start, interval_code, is_open, piece):
    """What reaches into each cell, `(cells,)` uint64: see `OPEN_VOID`."""
    n = code.size
    out = np.zeros(cells.size, np.uint64)
    for c in prange(cells.size):
        found = np.uint64(0)
        for a in range(8):
            i = cells[c] + corner_offsets[a]
            if code[i] >= 0 or is_open[piece[i]] != 0:
                found |= _bit(code[i])
            s = row_of[i]
            for b in range(a + 1, 8):
                if (a & b) == a and count[s, STEP_OF_BITS[b - a]] > 2:
                    d = STEP_OF_BITS[b - a]
                    at = start[s * 7 + d]
                    for q in range(1, np.int64(count[s, d]) - 1):
                        if interval_code[at + q] >= 0 or is_open[piece[n + at + q]] != 0:
                            found |= _bit(interval_code[at + q])
        out[c] = found
    return out


@njit(cache=True)
def _bit(code):
    """The bit of a film, or of a void."""
    return np.uint64(1) << np.uint64(code % 63 if code >= 0 else 63)


def cells_between(found: np.ndarray, stage: np.ndarray, source: np.ndarray) -> np.ndarray:
    """Which cells may hold a face of a staged film with the films that `source` marks or, if none, an open void.

    `found (cells,)` is that of `contents`; `stage` and `source` are as for `faces.bare_triangles`.
    """
    films = np.flatnonzero(source[len(source) // 2 :])
    mine = found & _mask(np.flatnonzero(stage))
    theirs = found & (_mask(films) if len(films) else OPEN_VOID)
    either = mine | theirs
    several = (either & (either - np.uint64(1))) != 0
    return np.flatnonzero((mine != 0) & (theirs != 0) & several)


def _mask(films: np.ndarray) -> np.uint64:
    """The bits of some films together."""
    return np.bitwise_or.reduce(np.uint64(1) << (films % 63).astype(np.uint64), initial=np.uint64(0))
