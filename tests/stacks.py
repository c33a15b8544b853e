"""Small film stacks for the tests: grids, films, masks and etches on them, and how to measure what came of them.

A grid of these is one cell wide in y unless told otherwise: a 2D run. Lengths are um, and a cell is 1 um unless told
otherwise, so that errors read in cells.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
from scipy.ndimage import map_coordinates

from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.directional import Beam
from flowemu.steps.models.isotropic import Arrival, arrive
from flowemu.steps.models.masking import print_resist


def even_grid(nx: int, low: float, high: float, cell: float = 1.0, ny: int = 1) -> Grid:
    """Cells of one size from height `low` to `high`, x and y from 0."""
    count = round((high - low) / cell)
    return Grid(0.0, 0.0, cell, nx, ny, low + cell * np.arange(count + 1.0))


def blank(name: str, material: str = "x", step: int = 1, state: str | None = None) -> Film:
    """A film to be put down; its fields are set when it is."""
    return Film(name, material, state, step, np.empty(0, np.float32))


def bare(grid: Grid, height: float = 0.0) -> FilmStack:
    """A bare wafer whose front lies at `height`, so that films can lie anywhere between two planes."""
    stack = FilmStack.bare(grid, "silicon")
    if height == 0.0:
        return stack
    top = stack.surface - np.float32(height)
    return FilmStack(grid, (Film("wafer", "silicon", None, 0, top),), top)


def by_number(stack: FilmStack, rates: Mapping[str, float]) -> dict[int, float]:
    """Rates by film name turned into rates by film number; films left out are at 0."""
    return {k: rates.get(film.name, 0.0) for k, film in enumerate(stack.films)}


def beam_etch(stack: FilmStack, rates: Mapping[str, float], time: float, wall: float = 90.0) -> FilmStack:
    """A directional etch of `time` s at rates of um/s by film name."""
    return stack.carve(Beam(stack, by_number(stack, rates), wall).removed(time))


def front(stack: FilmStack, rates: Mapping[str, float], limit: float = np.inf) -> Arrival:
    """Arrival times of an isotropic etch at rates of um/s by film name."""
    return arrive(stack, by_number(stack, rates), limit)


def wet_etch(stack: FilmStack, rates: Mapping[str, float], time: float) -> FilmStack:
    """An isotropic etch of `time` s at rates of um/s by film name."""
    return stack.carve(front(stack, rates, time).removed(time))


def printed(stack: FilmStack, opened: np.ndarray, thickness: float = 3.0, wall: float = 90.0) -> FilmStack:
    """Resist with an opening where `opened`, `(nx,)` or `(ny, nx)` um, is positive."""
    return print_resist(stack, blank("resist", "resist"), thickness, np.atleast_2d(opened), wall)


def stripped(stack: FilmStack, name: str = "resist") -> FilmStack:
    """The stack without every film of this name."""
    return stack.without({k for k, film in enumerate(stack.films) if film.name == name})


def trenched(grid: Grid, inside: Callable[[np.ndarray, np.ndarray], np.ndarray]) -> FilmStack:
    """A wafer bounded by an exact distance `inside(x, z)`, um, negative in the solid."""
    x, z = grid.x[None, None, :], grid.z[:, None, None]
    top = np.ascontiguousarray(np.broadcast_to(inside(x, z), grid.shape), np.float32)
    return FilmStack(grid, (Film("wafer", "silicon", None, 0, top),), top)


def film_of(stack: FilmStack, name: str) -> Film:
    """The last film of this name."""
    number = stack.index(name)
    assert number is not None, f"film {name} is gone"
    return stack.films[number]


def value_at(field: np.ndarray, grid: Grid, x: np.ndarray, z: np.ndarray) -> np.ndarray:
    """A field between its samples on the row y = 0, linear in x and z, at points `(n,)`."""
    iz = np.interp(z, grid.z, np.arange(grid.nz))
    ix = (np.asarray(x) - grid.x[0]) / grid.cell
    return map_coordinates(field[:, 0, :].astype(float), [iz, ix], order=1, mode="nearest")


def reach(field: np.ndarray, grid: Grid, foot: tuple[float, float], angles: np.ndarray, far: float) -> np.ndarray:
    """How far from `foot` (x, z) the field first changes its sign along rays at these angles (rad), um, `(n,)`."""
    s = np.arange(0.0, far, grid.cell / 50)
    out = []
    for angle in angles:
        value = value_at(field, grid, foot[0] + s * np.cos(angle), foot[1] + s * np.sin(angle))
        k = int(np.flatnonzero((value < 0) != (value[0] < 0))[0])
        out.append(s[k - 1] + (s[k] - s[k - 1]) * value[k - 1] / (value[k - 1] - value[k]))
    return np.array(out)


def crossings(line: np.ndarray, places: np.ndarray) -> np.ndarray:
    """Where a sampled line changes its sign, linear between the places, in order."""
    k = np.flatnonzero((line[1:] < 0) != (line[:-1] < 0))
    a, b = line[k].astype(float), line[k + 1].astype(float)
    return places[k] + a / (a - b) * (places[k + 1] - places[k])


def layers(stack: FilmStack, x: float, y: float = 0.5) -> list[tuple[str, float, float]]:
    """(film, from, to) of the column at (x, y), lowest first."""
    from flowemu.stack.columns import column

    return [(stack.films[layer.film].name, layer.low, layer.high) for layer in column(stack, x, y)]


def thickness(stack: FilmStack, name: str, x: float, y: float = 0.5) -> float:
    """Thickness of a film in the column at (x, y), um."""
    return sum(high - low for film, low, high in layers(stack, x, y) if film == name)
