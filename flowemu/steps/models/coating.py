"""Films that grow on every surface the open space reaches, and films that are spun level."""

from __future__ import annotations

import numpy as np

from flowemu.kernels import coating as kernel
from flowemu.kernels.redistance import extend_distance, redistance
from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from flowemu.stack.surfaces import distance_in_void

EXACT = 5.5  # cells above the surface whose distance is taken as it stands; beyond it is marched


def coat(stack: FilmStack, film: Film, thickness: float, coverage: float = 1.0) -> FilmStack:
    """Grow `film` by `thickness` um on flat surfaces and `coverage` times that on vertical walls.

    The new surface is the solid widened by an ellipsoid (a ball where the coverage is 1): a wall at
    any angle gets the ellipsoid's extent along its normal. Sealed voids get nothing.
    """
    grid, surface = stack.grid, stack.surface
    open_space = np.ascontiguousarray(stack.topology.on_grid(stack.topology.open_space))
    width = kernel.extent(surface, grid.z, grid.cell, grid.cell, coverage)
    code = np.ascontiguousarray(stack.topology.on_grid(stack.topology.code))
    away = distance_in_void(grid, stack.films, code, stack.band, coverage)
    near = np.where(open_space & (away < EXACT * grid.cell), away, np.float32(np.inf))
    across = grid.cell / coverage
    limit = thickness + stack.band / coverage
    far = extend_distance(near.astype(np.float32), open_space, across, across, grid.z, limit)
    top = np.where(open_space, np.minimum(far, limit), surface / width) - np.float32(thickness)
    if coverage < 1.0:
        top = kernel.normalise(top.astype(np.float32), open_space, grid.z, grid.cell, grid.cell)
        top = redistance(top, grid.cell, grid.cell, grid.z, stack.band)
    sealed = ~open_space & (surface > 0)
    top = np.where(sealed, np.maximum(surface, top), top)
    return stack.add(_topped(film, np.minimum(top, np.where(sealed, np.inf, surface))))


def spin(stack: FilmStack, film: Film, thickness: float, planarisation: float = 1.0, length: float = 10.0) -> FilmStack:
    """Spin `film` on: its top is level, `thickness` um above the mean surface, and gaps fill.

    Below full planarisation the top follows that share of the topography less, smoothed over
    `length` um.
    """
    from scipy.ndimage import gaussian_filter

    grid = stack.grid
    height = surface_heights(stack)
    level = float(height.mean())
    smooth = gaussian_filter(height, length / grid.cell, mode="mirror" if min(height.shape) > 1 else "nearest")
    top_height = planarisation * level + (1 - planarisation) * smooth + thickness
    z = grid.z[:, None, None]
    top = (z - top_height[None]).astype(np.float32)
    if planarisation < 1:
        top = redistance(
            kernel.normalise(top, np.ones(top.shape, bool), grid.z, grid.cell, grid.cell), grid.cell, grid.cell, grid.z, stack.band
        )
    open_space = stack.topology.on_grid(stack.topology.open_space)
    sealed = ~open_space & (stack.surface > 0)
    top = np.where(sealed, np.maximum(stack.surface, top), np.minimum(top, stack.surface))
    return stack.add(_topped(film, top))


def surface_heights(stack: FilmStack) -> np.ndarray:
    """Height of the topmost solid in every column, `(ny, nx)` um."""
    return kernel.heights(stack.surface, stack.grid.z)


def _topped(film: Film, top: np.ndarray) -> Film:
    return Film(film.name, film.material, film.state, film.step, np.ascontiguousarray(top, np.float32))
