"""Places thinner than the grid can tell."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Unresolved


def open_gaps(stack: FilmStack, step: int, film: str) -> Iterator[Unresolved]:
    """Open gaps without a sample across, whose walls a deposition would coat but the surface does not show."""
    t, grid = stack.topology, stack.grid
    inner = t.inner
    axis = inner.direction < 3
    between = (inner.code < 0) & (inner.below >= 0) & (inner.above >= 0)
    thin = axis & between & np.isin(t.piece[inner.node], t.open_roots)
    if not thin.any():
        return
    _, ny, nx = t.code.shape
    sample = t.samples[inner.row[thin]]
    z = sample // (ny * nx)
    length = np.where(inner.direction[thin] == 2, grid.z[np.minimum(z + 1, grid.nz - 1)] - grid.z[z], grid.cell)
    width = (inner.high[thin] - inner.low[thin]) * length
    worst = int(np.argmin(width))
    at = (
        float(grid.x[min(sample[worst] % nx, grid.nx - 1)]),
        float(grid.y[min((sample[worst] // nx) % ny, grid.ny - 1)]),
        float(grid.z[z[worst]]),
    )
    size = float(width[worst])
    yield Unresolved(
        step, film,
        f"film '{film}' grows over gaps as narrow as {size:.3g} um, less than two cells, and is not laid inside them",
        at, size,
    )  # fmt: skip
