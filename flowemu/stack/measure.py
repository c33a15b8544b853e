"""Volumes of films, from their fields."""

from __future__ import annotations

from weakref import WeakKeyDictionary

import numpy as np

from flowemu.stack.film import Film
from flowemu.stack.grid import Grid

EVERYWHERE = np.full((1, 1, 1), -1.0, dtype=np.float32)
NOWHERE = -EVERYWHERE
_measured: WeakKeyDictionary[Film, float] = WeakKeyDictionary()


def film_volume(film: Film, grid: Grid) -> float:
    """Volume of a film inside the grid's box, um3.

    The fields are taken as linear on tetrahedra between the samples and constant from the outermost
    samples to the box. Error: that of the fields alone; nothing is counted by whole cells, so a flat
    film of a tenth of a cell comes out exact. A film is measured once, as it never changes.
    """
    if film not in _measured:
        _measured[film] = _measure(film, grid)
    return _measured[film]


def _measure(film: Film, grid: Grid) -> float:
    from flowemu.kernels.volume import row_volumes

    widths = [gaps(grid.x, grid.box[0], grid.box[2]), gaps(grid.y, grid.box[1], grid.box[3])]
    heights = gaps(grid.z, float(grid.planes[0]), float(grid.planes[-1]))
    floor = NOWHERE if film.floor is None else film.floor
    gone = EVERYWHERE if film.gone is None else film.gone
    return float(row_volumes(film.top, floor, gone, widths[0], widths[1], heights).sum())


def gaps(samples: np.ndarray, start: float, end: float) -> np.ndarray:
    """Widths from `start` over the `(n,)` samples to `end`, `(n + 1,)`, um."""
    return np.diff(np.concatenate([[start], samples, [end]]))
