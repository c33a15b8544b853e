"""Small stacks from analytic fields, in um."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.stack import FilmStack


class Shapes:
    """Fields of planes, balls and boxes on one grid."""

    def __init__(self, grid: Grid) -> None:
        self.grid = grid
        self.z, self.y, self.x = np.meshgrid(grid.z, grid.y, grid.x, indexing="ij")

    def film(self, name: str, top: np.ndarray, floor: np.ndarray | None = None, gone: np.ndarray | None = None) -> Film:
        """A film of these fields."""
        fields = [None if field is None else np.asarray(field, dtype=np.float32) for field in (top, floor, gone)]
        return Film(name, "nitride", None, 1, *fields)

    def stack(self, *films: Film) -> FilmStack:
        """A stack of these films."""
        return FilmStack(self.grid, films, films[-1].top)

    def ball(self, x: float, y: float, z: float, radius: float) -> np.ndarray:
        """Distance to a ball."""
        return np.sqrt((self.x - x) ** 2 + (self.y - y) ** 2 + (self.z - z) ** 2) - radius

    def strip(self, x0: float, x1: float) -> np.ndarray:
        """Distance to all that lies between two planes across x."""
        return np.maximum(x0 - self.x, self.x - x1)


@pytest.fixture(scope="session")
def shapes() -> Shapes:
    """A window of 20 x 10 um at a cell of 0.5 um, with planes finer in the middle."""
    lower = -np.cumsum([0.25, 0.3, 0.36, 0.4, 0.5, 0.5, 0.5, 0.5])[::-1]
    upper = np.cumsum([0.25] * 12 + [0.3, 0.36, 0.4, 0.5, 0.5])
    return Shapes(Grid(0.0, 0.0, 0.5, 40, 20, np.concatenate([lower, [0.0], upper])))
