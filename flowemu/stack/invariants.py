"""What must hold of every film stack and of every change of one.

The stack asks for it on every add and carve where the environment holds `FLOWEMU_CHECK=1`; the tests
switch it on. Each function gives the faults as sentences, none where all is well.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from flowemu.stack.grid import Grid
    from flowemu.stack.stack import FilmStack

SWITCH = "FLOWEMU_CHECK"
GRADIENT = 0.01  # how far |gradient| may be from 1 on smooth parts
REACH = 3.0  # cells to either side of a surface within which that holds
BENT = 0.1  # a sample whose field bends more than this, in 1 / cells, is not on a smooth part
ROUNDING = 1e-5  # of a cell
SLACK = 1e-4  # of a film's volume


class BrokenInvariantError(AssertionError):
    """A change of a film stack broke one of its promises; a fault of the program."""


def watch(before: FilmStack, after: FilmStack, how: str, touched: set[int] | None = None) -> FilmStack:
    """`after` itself, looked through first where the environment asks for it.

    Raises
    ------
    BrokenInvariantError
        Something that must hold does not.
    """
    if os.environ.get(SWITCH) == "1" and after is not before:
        kept = set(range(len(before.films))) - (touched or set())
        faults = list(changed_films(before, after, kept))
        faults += [*not_nested(before, after)] if how == "add" else [*lowered(before, after), *grown(before, after)]
        if faults:
            raise BrokenInvariantError(f"{how}: " + "; ".join(faults))
    return after


def not_nested(before: FilmStack, after: FilmStack) -> Iterator[str]:
    """A film just laid lies on the surface that was there, and its top nowhere below that."""
    film = after.films[-1]
    if film.floor is not before.surface:
        yield f"film '{film.name}' does not lie on the surface that was there"
    below = float(np.max(film.top - before.surface))
    if below > ROUNDING * after.grid.cell:
        yield f"the top of film '{film.name}' lies up to {below:.3g} um below its floor"


def changed_films(before: FilmStack, after: FilmStack, kept: set[int]) -> Iterator[str]:
    """Films that were to stay as they are and have another field than before."""
    for k in sorted(kept):
        film = before.films[k]
        like = [f for f in after.films if (f.name, f.step) == (film.name, film.step)]
        if like and not any(f.top is film.top and f.floor is film.floor and f.gone is film.gone for f in like):
            yield f"film '{film.name}' changed although nothing acts on it"


def lowered(before: FilmStack, after: FilmStack) -> Iterator[str]:
    """Films of which a carve lowered a field: what is gone stays gone."""
    old = {(f.name, f.step): f for f in before.films}
    for film in after.films:
        was = old.get((film.name, film.step))
        if was is None or was is film:
            continue
        for name in ("top", "gone"):
            a, b = getattr(was, name), getattr(film, name)
            if a is not None and (b is None or bool((b < a).any())):
                yield f"the {name} field of film '{film.name}' was lowered by a carve"


def grown(before: FilmStack, after: FilmStack) -> Iterator[str]:
    """Films whose volume grew under a carve."""
    from flowemu.stack.measure import film_volume

    old = {(f.name, f.step): f for f in before.films}
    for film in after.films:
        was = old.get((film.name, film.step))
        if was is None or was is film:
            continue
        volume, volume_now = film_volume(was, before.grid), film_volume(film, after.grid)
        if volume_now > volume * (1 + SLACK):
            yield f"film '{film.name}' grew from {volume:.6g} to {volume_now:.6g} um3 although it was carved"


def off_gradient(field: np.ndarray, grid: Grid) -> tuple[np.ndarray, np.ndarray]:
    """How far |gradient| is from 1 on the smooth parts of a field, and which samples those are.

    Returns
    -------
    off : (nz, ny, nx) float64, smooth : (nz, ny, nx) bool
        Smooth are samples within three cells of the surface round which the field bends by less than
        `BENT` per cell over two cells each way; the outermost samples are left out.
    """
    axes = [(0, grid.z), (1, grid.y), (2, grid.x)]
    wide = [(axis, places) for axis, places in axes if len(places) > 4]
    slopes = [np.gradient(field.astype(np.float64), places, axis=axis) for axis, places in wide]
    off = np.abs(np.sqrt(sum(s * s for s in slopes)) - 1.0)
    bent = np.zeros(field.shape)
    for slope in slopes:
        for axis, places in wide:
            bent = np.maximum(bent, np.abs(np.gradient(slope, places, axis=axis)) * grid.cell)
    smooth = (np.abs(field) < REACH * grid.cell) & (_spread(bent, wide) < BENT)
    for axis, _ in wide:
        edge = [slice(None)] * 3
        for side in (slice(0, 1), slice(-1, None)):
            edge[axis] = side
            smooth[tuple(edge)] = False
    return off, smooth


def _spread(values: np.ndarray, wide: list[tuple[int, np.ndarray]]) -> np.ndarray:
    """The greatest value within two samples along every axis."""
    out = values
    for axis, _ in wide:
        for _ in range(2):
            low, high = np.roll(out, 1, axis), np.roll(out, -1, axis)
            out = np.maximum(out, np.maximum(low, high))
    return out
