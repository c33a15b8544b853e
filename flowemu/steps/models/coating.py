"""Films that grow on every surface the open space reaches, and films that are spun level."""

from __future__ import annotations

import numpy as np

from flowemu.kernels import coating as kernel
from flowemu.kernels.redistance import extend_distance, redistance
from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from flowemu.stack.surfaces import distance_in_void

ROUNDING = 1e-3  # of the band
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
        within = surface < (1 - ROUNDING) * stack.band  # beyond it the surface field says no more than the band
        thinnest = np.where(within, surface - np.float32(0.5 * thickness * coverage), np.float32(np.inf))
        top = np.minimum(top, thinnest)
    if thickness * coverage < grid.cell:
        top = _over_corners(stack, top, open_space, 0.5 * thickness * coverage)
    return _laid(stack, film, np.minimum(top, surface), open_space)


def _over_corners(stack: FilmStack, top: np.ndarray, open_space: np.ndarray, least: float) -> np.ndarray:
    """The top of a thin film, raised where the sharp corner of a film below would come through it."""
    top = np.ascontiguousarray(top, np.float32)
    for film in stack.films:
        if film.gone is not None:
            for face in (film.top, film.floor):
                if face is not None:
                    top = kernel.cover_corners(top, face, film.gone, open_space, np.float32(least))
    return top


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
        near = kernel.normalise(top, np.ones(top.shape, bool), grid.z, grid.cell, grid.cell)
        top = redistance(near, grid.cell, grid.cell, grid.z, stack.band)
    open_space = stack.topology.on_grid(stack.topology.open_space)
    return _laid(stack, film, np.minimum(top, stack.surface), open_space)


def surface_heights(stack: FilmStack) -> np.ndarray:
    """Height of the topmost solid in every column, `(ny, nx)` um."""
    return kernel.heights(stack.surface, stack.grid.z)


def _laid(stack: FilmStack, film: Film, top: np.ndarray, open_space: np.ndarray) -> FilmStack:
    """The stack with the film on it; sealed voids get none of it."""
    sealed = ~open_space & (stack.surface > 0)
    gone = None
    if sealed.any():
        top = np.where(sealed, stack.surface, top)
        gone = kernel.kept_out(sealed, stack.surface, np.float32(stack.band))
    top = np.ascontiguousarray(top, np.float32)
    return stack.add(Film(film.name, film.material, film.state, film.step, top, None, gone))
