"""Where a cross-section runs: the cut line inside the window, and the fields sampled along it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowemu.errors import RunError
from flowemu.stack.grid import Grid

Point = tuple[float, float]
CLOSEST = 1e-3
FAR = 1e6


@dataclass(frozen=True, eq=False)
class Cut:
    """A cut through the grid along a line, with the places where the fields are sampled.

    Attributes
    ----------
    line : points (x, y), um
        The cut line, clipped to the window.
    along : (ns,) float64, um
        Distance of each sampled column from the line's start.
    x, y : (ns,) float64, um
        Where the columns stand.
    heights : (nz + 2,) float64, um
        The grid's lower end, its sample heights, its upper end.
    levels : (nz + 2,) float64
        The same counted in cells, so that one step is one cell however the planes are graded.
    cell : float, um
    """

    line: tuple[Point, ...]
    along: np.ndarray
    x: np.ndarray
    y: np.ndarray
    heights: np.ndarray
    levels: np.ndarray
    cell: float

    @property
    def length(self) -> float:
        """Length of the line, um."""
        return float(self.along[-1])


def cut_along(grid: Grid, line: Sequence[Point]) -> Cut:
    """Lay a cut line through the grid.

    A column stands wherever the line crosses a row or column of samples, so that along x or y the
    fields' own linear pieces are met exactly; on a slanting line one more stands midway between.

    Raises
    ------
    RunError
        The line has no length inside the window.
    """
    inside = clipped(grid, line)
    pieces = [columns(grid, inside[i], inside[i + 1]) for i in range(len(inside) - 1)]
    steps = [np.hypot(*(np.subtract(inside[i + 1], inside[i]))) for i in range(len(inside) - 1)]
    starts = np.concatenate([[0.0], np.cumsum(steps)])
    along, x, y = [], [], []
    for i, share in enumerate(pieces):
        share = share if i == len(pieces) - 1 else share[:-1]
        along.append(starts[i] + share * steps[i])
        x.append(inside[i][0] + share * (inside[i + 1][0] - inside[i][0]))
        y.append(inside[i][1] + share * (inside[i + 1][1] - inside[i][1]))
    heights = np.concatenate([[grid.planes[0]], grid.z, [grid.planes[-1]]])
    levels = np.concatenate([[-0.5], np.arange(grid.nz), [grid.nz - 0.5]])
    return Cut(inside, np.concatenate(along), np.concatenate(x), np.concatenate(y), heights, levels, grid.cell)


def clipped(grid: Grid, line: Sequence[Point]) -> tuple[Point, ...]:
    """The longest piece of a line inside the window, um."""
    import shapely

    within = shapely.intersection(shapely.LineString(line), shapely.box(*grid.box))
    pieces = [part for part in shapely.get_parts(within) if part.length > CLOSEST * grid.cell]
    if not pieces:
        x0, y0, x1, y1 = grid.box
        raise RunError(f"the cut line does not pass through the window ({x0:g}, {y0:g}) to ({x1:g}, {y1:g}) um")
    longest = max(pieces, key=lambda part: part.length)
    points = [(float(px), float(py)) for px, py in longest.coords]
    if np.dot(np.subtract(points[-1], points[0]), np.subtract(line[-1], line[0])) < 0:
        points.reverse()
    return tuple(points)


def columns(grid: Grid, start: Point, end: Point) -> np.ndarray:
    """Shares of the way from `start` to `end`, rising from 0 to 1, at which columns stand."""
    crossed = [
        (samples - a) / (b - a)
        for samples, a, b in ((grid.x, start[0], end[0]), (grid.y, start[1], end[1]))
        if abs(b - a) > CLOSEST * grid.cell
    ]
    met = np.sort(np.concatenate([[0.0, 1.0], *crossed]))
    met = met[(met >= 0.0) & (met <= 1.0)]
    apart = CLOSEST * grid.cell / float(np.hypot(end[0] - start[0], end[1] - start[1]))
    kept = np.concatenate([met[:-1][np.diff(met) > apart], [1.0]])
    kept[0] = 0.0
    if len(crossed) < 2:
        return kept
    return np.sort(np.concatenate([kept, 0.5 * (kept[1:] + kept[:-1])]))


def sampled(field: np.ndarray, grid: Grid, cut: Cut) -> np.ndarray:
    """A field on the cut, `(nz + 2, ns)` float64: bilinear in x and y, constant beyond the outer samples."""
    values = np.zeros((grid.nz, len(cut.along)))
    for iy, wy in neighbours(cut.y, grid.y[0], grid.cell, grid.ny):
        for ix, wx in neighbours(cut.x, grid.x[0], grid.cell, grid.nx):
            values += np.clip(field[:, iy, ix], -FAR, FAR) * (wx * wy)
    return np.concatenate([values[:1], values, values[-1:]])


def neighbours(at: np.ndarray, first: float, cell: float, count: int) -> list[tuple[np.ndarray, np.ndarray]]:
    """The two samples around each place in `at`, um, as indices and weights."""
    place = np.clip((at - first) / cell, 0.0, count - 1.0)
    low = np.minimum(place.astype(np.int64), max(count - 2, 0))
    high = np.minimum(low + 1, count - 1)
    return [(low, 1.0 - (place - low)), (high, place - low)]
