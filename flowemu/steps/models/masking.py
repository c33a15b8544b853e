"""Resist printed through a mask: where it is opened, and how its wall leans."""

from __future__ import annotations

import numpy as np

from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.coating import spin, surface_heights

FOOT = 3  # cells to either side of an edge in which the highest point carries the resist's foot


def print_resist(stack: FilmStack, resist: Film, thickness: float, opened: np.ndarray, wall: float) -> FilmStack:
    """Spin resist on and develop it down to the film below wherever `opened` is positive.

    Parameters
    ----------
    thickness : um above the mean surface
    opened : (ny, nx) float, um; planar distance to the printed edge, positive in the opened area
    wall : degrees; below 90 the resist is wider at its foot, about which the wall pivots
    """
    coated = spin(stack, resist, thickness)
    grid = stack.grid
    removed = np.empty(grid.shape, np.float32)
    if wall == 90.0:
        removed[:] = opened
    else:
        angle, foot = np.radians(wall), foot_heights(surface_heights(stack), opened)
        for plane, height in zip(removed, grid.z, strict=True):
            plane[:] = (opened + (height - foot) / np.tan(angle)) * np.sin(angle)
    return coated.carve({len(coated.films) - 1: removed})


def foot_heights(heights: np.ndarray, opened: np.ndarray) -> np.ndarray:
    """Height of the highest point under the nearest printed edge, `(ny, nx)` um."""
    from scipy.ndimage import distance_transform_edt, maximum_filter

    inside = opened > 0
    edge = np.zeros_like(inside)
    edge[:, 1:] |= inside[:, 1:] != inside[:, :-1]
    edge[1:, :] |= inside[1:, :] != inside[:-1, :]
    highest = maximum_filter(heights, size=2 * FOOT + 1)
    if not edge.any():
        return highest
    nearest = distance_transform_edt(~edge, return_distances=False, return_indices=True)
    return np.asarray(highest[tuple(nearest)])
