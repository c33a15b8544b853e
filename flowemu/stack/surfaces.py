"""The surface field of a stack after something was taken away."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from flowemu.kernels import surface as kernel
from flowemu.kernels.redistance import redistance
from flowemu.stack.film import BAND, Film
from flowemu.stack.grid import Grid
from flowemu.stack.topology import Topology

SAME = 2e-5  # of a cell: a smaller change of the surface is rounding, and the old value stays


def recut_surface(grid: Grid, films: Sequence[Film], topology: Topology, old: np.ndarray) -> np.ndarray:
    """Signed distance to the surface of the films' union, `(nz, ny, nx)` float32.

    In the void it is the distance to the nearest film, from the films' own fields; in the solid the
    samples next to a void take the value of the field that ends them, and the deeper ones the
    distance marched from there. Samples that did not change keep their old value to the bit.
    """
    band = BAND * grid.cell
    code = np.ascontiguousarray(topology.on_grid(topology.code))
    new = distance_in_void(grid, films, code, band)
    shape = topology.code.shape
    depth = kernel.solid_depths(
        topology.samples, topology.row_of, topology.code.reshape(-1), topology.values, topology.strides, shape,
        topology.count, topology.start, topology.interval_code, topology.interval_end,
    )  # fmt: skip
    inside = np.full(topology.code.size, np.float32(band), np.float32)
    inside[topology.samples] = np.minimum(depth, band)
    inside = topology.on_grid(inside)
    solid = code >= 0
    new[solid] = -np.maximum(inside[solid], 1e-6)
    new = redistance(new, grid.cell, grid.cell, grid.z, band, sides=(-1,))
    far = (np.minimum(np.abs(new), np.abs(old)) >= band) & ((new < 0) == (old < 0))
    same = far | (np.abs(new - old) < SAME * grid.cell)
    return np.where(same, old, new)


def distance_in_void(
    grid: Grid, films: Sequence[Film], code: np.ndarray, band: float, coverage: float = 1.0
) -> np.ndarray:
    """Distance of every void sample to the nearest film, at most `band`; `band` in the solid too.

    Below a coverage of 1 lengths across are counted longer, by 1 / coverage.
    """
    out = np.full(grid.shape, np.float32(band), np.float32)
    for film in films:
        floor = film.top if film.floor is None else film.floor
        gone = film.top if film.gone is None else film.gone
        kernel.lower_to_film(
            out, code, film.top, floor, gone, film.floor is not None, film.gone is not None,
            grid.z, grid.cell, grid.cell, np.float32(band), coverage,
        )  # fmt: skip
    return out
