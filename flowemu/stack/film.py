"""A film: what one step put down, bounded by three fields."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

BAND = 6.0
"""Cells to either side of a surface within which its field is a distance."""


@dataclass(frozen=True, eq=False)
class Film:
    """One film of the stack (the wafer is the first).

    Its solid is where `top < 0`, `floor >= 0` and `gone < 0`. Each field is a signed distance in um
    on the grid, `(nz, ny, nx)` float32, and is interpolated on its own before the three are
    compared, so the film keeps its exact thickness and edges however thin it is, backed or free.

    Attributes
    ----------
    top : ndarray
        Distance to the boundary of the solid just after this film was put down, negative inside.
    floor : ndarray or None
        The same just before; None for the wafer, which has nothing below it.
    gone : ndarray or None
        Distance to the boundary of what was removed from the film, positive where it is gone;
        None while nothing was.
    """

    name: str
    material: str
    state: str | None
    step: int
    top: np.ndarray
    floor: np.ndarray | None = None
    gone: np.ndarray | None = None
