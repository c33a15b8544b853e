"""Stripping: a film goes wherever the open space reaches it."""

from __future__ import annotations

from typing import Any

import numpy as np

from flowemu.errors import StepError
from flowemu.kernels import fronts
from flowemu.stack.film import Film
from flowemu.stack.measure import film_volume
from flowemu.stack.removed import whole_pieces
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Cut, Loss, Wafer
from flowemu.steps.models.passage import cells_with_faces

SLIVER = 0.5  # cells^3: a piece without a sample below this is rounding


def strip_film(wafer: Wafer, name: str, agent: str, tools: Any) -> Wafer:
    """The wafer without the named film; what is buried of it stays.

    Raises
    ------
    StepError
        There is no such film, or nothing of it can be reached.
    """
    stack = wafer.stack
    numbers = [k for k, film in enumerate(stack.films) if film.name == name]
    if not numbers:
        raise StepError(f"there is no film '{name}' on the wafer")
    losses, whole, partly = [], set(), {}
    for k in numbers:
        reached = _reached_pieces(stack, k)
        mine = _pieces(stack, k)
        if not len(reached):
            continue
        if np.isin(mine, reached).all():
            whole.add(k)
        else:
            partly[k] = whole_pieces(stack, k, reached)
        film = stack.films[k]
        losses.append(Loss(name, film.material, 0.0, 0.0, 0.0, film_volume(film, stack.grid), True, True))
    if not losses:
        raise StepError(f"film '{name}' is buried; nothing of it can be reached")
    after = _without(stack.carve(partly), [stack.films[k] for k in whole])
    cut = Cut(tools.step, "strip", agent, 0.0, None, tuple(losses))
    back = tuple(coat for coat in wafer.back if coat.name != name)
    return wafer.now(after, cut, back=back, printed=None if name == "resist" else wafer.printed)


def _without(stack: FilmStack, films: list[Film]) -> FilmStack:
    """The stack without these very films, whatever their numbers are by now."""
    return stack.without({k for k, film in enumerate(stack.films) if any(film is gone for gone in films)})


def _pieces(stack: FilmStack, k: int) -> np.ndarray:
    """Roots of the pieces of film `k`; slivers without a sample are left out and go with the rest."""
    t, cell = stack.topology, stack.grid.cell
    sample = np.flatnonzero(t.code.reshape(-1) == k)
    thick = sample[t.piece[sample] == sample]  # a piece's root is the first of its samples
    inner = t.inner
    upright = (inner.code == k) & (inner.direction == 2)
    _, ny, nx = t.code.shape
    z = t.samples[inner.row[upright]] // (ny * nx)
    height = (inner.high - inner.low)[upright] * (stack.grid.z[z + 1] - stack.grid.z[z])
    roots, at = np.unique(t.piece[inner.node[upright]], return_inverse=True)
    total = np.bincount(at, weights=height, minlength=len(roots)) if len(roots) else np.empty(0)
    return np.union1d(thick, roots[total >= SLIVER * cell])


def _reached_pieces(stack: FilmStack, k: int) -> np.ndarray:
    """Roots of the pieces of film `k` that border on the open space."""
    t = stack.topology
    along_edges = np.unique(
        fronts.bare_pieces(
            t.samples, t.code.reshape(-1), t.strides, t.count, t.start, t.interval_code, t.piece, t.open_roots, k
        )
    )
    if np.isin(_pieces(stack, k), along_edges).all():
        return along_edges
    return np.union1d(along_edges, _pieces_with_faces(stack, k))


def _pieces_with_faces(stack: FilmStack, k: int) -> np.ndarray:
    """Roots of the pieces of film `k` in cells with a bare face of it, which need cross no edge where it is thin."""
    t = stack.topology
    cells = cells_with_faces(stack, k)
    near = np.zeros(t.code.size, bool)
    for offset in t.corner_offsets:
        near[cells + offset] = True
    inner = t.inner
    ends = t.samples[inner.row]
    thin = (inner.code == k) & near[ends] & near[ends + t.strides[inner.direction]]
    own = np.flatnonzero(near & (t.code.reshape(-1) == k))
    return np.union1d(t.piece[own], t.piece[inner.node[thin]])
