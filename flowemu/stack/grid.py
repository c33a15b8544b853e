"""The grid: uniform in x and y, graded in z."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

MAX_SPACING_RATIO = 1.3


@dataclass(frozen=True, eq=False)
class Grid:
    """Cells on which every field is sampled at the centres.

    Arrays over the grid are `(nz, ny, nx)`, C order, so that one z plane is contiguous. A grid one
    cell wide in y is a 2D run.

    Attributes
    ----------
    x0, y0 : float, um
        The window's lower left corner.
    cell : float, um
        Edge of a cell in x and y.
    nx, ny : int
        Number of cells in x and y.
    planes : (nz + 1,) float64, um
        The cells' boundaries in z, rising; z = 0 is the wafer's front face.
    """

    x0: float
    y0: float
    cell: float
    nx: int
    ny: int
    planes: np.ndarray

    @property
    def nz(self) -> int:
        return len(self.planes) - 1

    @property
    def shape(self) -> tuple[int, int, int]:
        return (self.nz, self.ny, self.nx)

    @property
    def cells(self) -> int:
        return self.nz * self.ny * self.nx

    @cached_property
    def x(self) -> np.ndarray:
        """Cell centres in x, um."""
        return self.x0 + (np.arange(self.nx) + 0.5) * self.cell

    @cached_property
    def y(self) -> np.ndarray:
        """Cell centres in y, um."""
        return self.y0 + (np.arange(self.ny) + 0.5) * self.cell

    @cached_property
    def z(self) -> np.ndarray:
        """Cell centres in z, um."""
        return 0.5 * (self.planes[1:] + self.planes[:-1])

    @cached_property
    def dz(self) -> np.ndarray:
        """Cell heights, `(nz,)` um."""
        return np.diff(self.planes)

    @property
    def box(self) -> tuple[float, float, float, float]:
        """The window `(x0, y0, x1, y1)`, um."""
        return (self.x0, self.y0, self.x0 + self.nx * self.cell, self.y0 + self.ny * self.cell)
