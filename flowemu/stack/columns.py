"""What lies under a point: films and heights along a column, and thicknesses of whole films."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from flowemu.kernels import beam
from flowemu.kernels.regions import MAX_INTERVALS, partition
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import FieldTable


@dataclass(frozen=True)
class Layer:
    """A stretch of one film in a column, heights in um."""

    film: int
    low: float
    high: float


def column(stack: FilmStack, x: float, y: float) -> list[Layer]:
    """Films under the point (x, y), um, lowest first; gaps between them are void.

    Fields are interpolated between columns of samples, so thin films keep their thickness. The first
    and last entries end at the grid's outer samples.
    """
    table = FieldTable.of(stack.films)
    values = np.stack([_at(stack, field, x, y) for field in table.arrays], axis=1)
    layers: list[Layer] = []
    codes, ends = np.empty(MAX_INTERVALS, np.int16), np.empty(MAX_INTERVALS, np.float32)
    cuts, mid = np.empty(MAX_INTERVALS, np.float64), np.empty(len(table.arrays), np.float64)
    z = stack.grid.z
    for k in range(len(z) - 1):
        n = partition(values[k], values[k + 1], table.top, table.floor, table.gone, codes, ends, cuts, mid)
        low = float(z[k])
        for code, end in zip(codes[:n], ends[:n], strict=True):
            high = float(z[k] + float(end) * (z[k + 1] - z[k]))
            if code >= 0:
                if layers and layers[-1].film == code and abs(layers[-1].high - low) < 1e-9:
                    layers[-1] = Layer(int(code), layers[-1].low, high)
                else:
                    layers.append(Layer(int(code), low, high))
            low = high
    return layers


def _at(stack: FilmStack, field: np.ndarray, x: float, y: float) -> np.ndarray:
    grid = stack.grid
    fx = min(max((x - grid.x0) / grid.cell - 0.5, 0.0), grid.nx - 1.0)
    fy = min(max((y - grid.y0) / grid.cell - 0.5, 0.0), grid.ny - 1.0)
    ix, iy = min(int(fx), max(grid.nx - 2, 0)), min(int(fy), max(grid.ny - 2, 0))
    jx, jy = min(ix + 1, grid.nx - 1), min(iy + 1, grid.ny - 1)
    wx, wy = fx - ix, fy - iy
    low = (1 - wx) * field[:, iy, ix].astype(np.float64) + wx * field[:, iy, jx]
    high = (1 - wx) * field[:, jy, ix].astype(np.float64) + wx * field[:, jy, jx]
    return (1 - wy) * low + wy * high


def column_edges(stack: FilmStack) -> tuple[np.ndarray, ...]:
    """What the kernels of `kernels.beam` need of the stack, in their order."""
    t = stack.topology
    return t.code, t.row_of, t.count, t.start, t.interval_code, t.interval_end, stack.grid.z


def thickness_maps(stack: FilmStack) -> np.ndarray:
    """Total vertical thickness of every film in every column, `(films, ny, nx)` um."""
    _, ny, nx = stack.grid.shape
    return beam.column_thickness(*column_edges(stack), len(stack.films))[:, :ny, :nx]


def topmost(stack: FilmStack) -> np.ndarray:
    """Number of the film seen from above in every column, -1 for none, `(ny, nx)` int32."""
    _, ny, nx = stack.grid.shape
    stopping = np.full(len(stack.films), np.inf)
    return beam.strike(*column_edges(stack), stopping, 0.0)[3][:ny, :nx]
