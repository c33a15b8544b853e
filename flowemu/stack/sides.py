"""Where pieces of film thinner than a cell end sideways, between columns of samples."""

from __future__ import annotations

import numpy as np

from flowemu.stack.stack import FilmStack

ACROSS = ((-1, 0), (1, 0), (0, -1), (0, 1))


def side_points(stack: FilmStack, pieces: np.ndarray) -> np.ndarray:
    """Points where thin pieces of film end beside their columns, `(m, 3)` float64 (x, y, z) um.

    A piece that holds no sample in a column has no end on the grid's own level edges. Its end is found
    halfway up the piece instead, on a level line to the next column, from the film's fields there;
    exact to the fields.

    Parameters
    ----------
    pieces : (p,) int64, sorted
        Roots in `Topology.piece`.
    """
    t, grid = stack.topology, stack.grid
    inner = t.inner
    mine = (inner.direction == 2) & (inner.code >= 0) & np.isin(t.piece[inner.node], pieces)
    if not mine.any():
        return np.empty((0, 3))
    sample = t.samples[inner.row[mine]]
    middle = 0.5 * (inner.low[mine] + inner.high[mine]).astype(np.float64)
    film = inner.code[mine]
    found = [_ends(stack, k, sample[film == k], middle[film == k], step) for k in np.unique(film) for step in ACROSS]
    points = np.concatenate(found)
    points[:, :2] += grid.x0, grid.y0
    return points


def _ends(stack: FilmStack, k: int, sample: np.ndarray, middle: np.ndarray, step: tuple[int, int]) -> np.ndarray:
    """Ends of film `k` on level lines one cell long, `(m, 3)` um from the window's lower left corner."""
    grid = stack.grid
    z, y, x = np.unravel_index(sample, stack.topology.code.shape)
    to_x, to_y = x + step[0], y + step[1]
    inside = (x < grid.nx) & (y < grid.ny) & (to_x >= 0) & (to_x < grid.nx) & (to_y >= 0) & (to_y < grid.ny)
    z, y, x, to_y, to_x, middle = (a[inside] for a in (z, y, x, to_y, to_x, middle))
    share = np.full(len(z), np.inf)
    film = stack.films[k]
    for field, sign in ((film.top, 1.0), (film.floor, -1.0), (film.gone, 1.0)):
        if field is not None:
            here, there = (
                sign * ((1 - middle) * field[z, b, a] + middle * field[z + 1, b, a]) for b, a in ((y, x), (to_y, to_x))
            )
            ends = (here < 0) & (there > 0)
            share[ends] = np.minimum(share[ends], here[ends] / (here[ends] - there[ends]))
    z, y, x, middle, share = (a[np.isfinite(share)] for a in (z, y, x, middle, share))
    height = grid.z[z] + middle * (grid.z[z + 1] - grid.z[z])
    return np.stack([(x + 0.5 + share * step[0]) * grid.cell, (y + 0.5 + share * step[1]) * grid.cell, height], axis=1)
