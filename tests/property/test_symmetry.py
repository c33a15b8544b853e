"""Mirrored or turned by a quarter, a flow gives the mirrored or turned structure.

A deposit and a beam work on distances and columns, so they commute but for what a march's order does where two sides
are equally near: up to 0.02 cell at single samples a cell off the surface. An isotropic front starts from faces in
tetrahedra, which the grid's cells are cut into along one diagonal; neither a mirror in one axis nor a quarter-turn
keeps that diagonal. Each of the two divisions may be off by the 0.1 cell that an undercut is promised to be right to,
hence at most 0.2 between them; on flats and straight walls there is nothing.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.coating import coat
from tests import stacks
from tests.property.flows import LENGTH, PHASES, Layout

QUICK = settings(max_examples=4, deadline=None, derandomize=True, phases=PHASES)
HEIGHT = st.integers(0, 15).map(lambda k: k / 16)
Turn = Callable[[np.ndarray], np.ndarray]
TURNS: dict[str, Turn] = {
    "mirror in x": lambda a: np.ascontiguousarray(a[..., ::-1]),
    "mirror in y": lambda a: np.ascontiguousarray(a[..., ::-1, :]),
    "quarter-turn": lambda a: np.ascontiguousarray(np.rot90(a, axes=(-2, -1))),
}
BOXES = st.lists(
    st.tuples(st.integers(1, 7), st.integers(1, 7), st.integers(3, 6), st.integers(3, 6)), min_size=1, max_size=2
)
LAYOUT = st.builds(lambda boxes, k: Layout(tuple(boxes), k / 16), BOXES, st.integers(0, 15))


def start(layout: Layout, height: float) -> FilmStack:
    """Glass 2.3 cells thick with openings down to the wafer."""
    stack = coat(stacks.bare(stacks.even_grid(14, -4, 10, ny=14), 0.2), stacks.blank("glass"), 2.0 + height)
    stack = stacks.printed(stack, layout.opened(stack))
    return stacks.stripped(stacks.beam_etch(stack, {"glass": 1.0}, 4.0))


def turned(stack: FilmStack, turn: Turn) -> FilmStack:
    """The same films with all their fields turned; a field that two films share stays shared."""
    made: dict[int, np.ndarray] = {}

    def of(field: np.ndarray | None) -> np.ndarray | None:
        if field is None:
            return None
        return made.setdefault(id(field), turn(field))

    films = tuple(
        Film(f.name, f.material, f.state, f.step, of(f.top), of(f.floor), of(f.gone))  # type: ignore[arg-type]
        for f in stack.films
    )
    return FilmStack(stack.grid, films, of(stack.surface))  # type: ignore[arg-type]


def apart(stack: FilmStack, other: FilmStack) -> np.ndarray:
    """How far apart two surfaces are at samples within a cell and a half of one of them, um, `(n,)`."""
    near = np.minimum(np.abs(stack.surface), np.abs(other.surface)) < 1.5
    return np.abs(stack.surface - other.surface)[near]


@pytest.mark.parametrize("name", list(TURNS))
@QUICK
@given(LAYOUT, HEIGHT, st.integers(16, 48).map(lambda n: n / 16))
def test_a_conformal_deposit_commutes(name: str, layout: Layout, height: float, thickness: float) -> None:
    """Films of a cell and more: 1e-4 cell on average, 0.02 at most."""
    turn = TURNS[name]
    stack = start(layout, height)
    after = coat(stack, stacks.blank("film", step=2), thickness)
    again = coat(turned(stack, turn), stacks.blank("film", step=2), thickness)
    off = apart(turned(after, turn), again)
    assert off.mean() < 1e-4
    assert off.max() < 0.02


@pytest.mark.parametrize("name", list(TURNS))
@QUICK
@given(LAYOUT, HEIGHT, LENGTH)
def test_a_directional_etch_commutes(name: str, layout: Layout, height: float, depth: float) -> None:
    """Walls and floors of two films of unlike rates: 1e-4 cell on average, 0.02 at most."""
    turn = TURNS[name]
    stack = start(layout, height)
    rates = {"glass": 1.0, "wafer": 0.3}
    after = stacks.beam_etch(stack, rates, depth)
    off = apart(turned(after, turn), stacks.beam_etch(turned(stack, turn), rates, depth))
    assert off.mean() < 1e-4
    assert off.max() < 0.02


@pytest.mark.parametrize("name", list(TURNS))
@QUICK
@given(LAYOUT, HEIGHT, LENGTH)
def test_an_isotropic_etch_commutes(name: str, layout: Layout, height: float, depth: float) -> None:
    """Two films of unlike rates over openings with corners: 0.01 cell on average, 0.2 at most."""
    turn = TURNS[name]
    stack = coat(start(layout, height), stacks.blank("fill", step=2), 3.0)
    after = stacks.wet_etch(stack, {"fill": 1.0, "glass": 0.7}, depth)
    off = apart(turned(after, turn), stacks.wet_etch(turned(stack, turn), {"fill": 1.0, "glass": 0.7}, depth))
    assert off.mean() < 0.01
    assert off.max() < 0.2
