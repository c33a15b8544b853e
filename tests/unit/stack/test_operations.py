"""Add, carve and split, and what they promise."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.film import Film
from flowemu.stack.invariants import BrokenInvariantError, off_gradient
from flowemu.stack.measure import film_volume
from flowemu.steps.models.coating import coat, spin
from tests import stacks

FIELDS = ("top", "floor", "gone")


def layered(ny: int = 1, nx: int = 20):
    """A wafer with a patterned film of 2.3, up to x = 9.3, under one of 1.1."""
    grid = stacks.even_grid(nx, -8, 16, ny=ny)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("low"), 2.3)
    stack = stacks.printed(stack, np.broadcast_to(grid.x - 9.3, (ny, nx)))
    stack = stacks.stripped(stacks.beam_etch(stack, {"low": 1.0}, 2.4))
    return coat(stack, stacks.blank("high", step=2), 1.1)


def fields_of(stack) -> list[np.ndarray | None]:
    return [getattr(film, name) for film in stack.films for name in FIELDS]


def test_adding_leaves_every_field_below_as_it_is():
    stack = layered()
    more = coat(stack, stacks.blank("more", step=3), 0.4)
    assert all(a is b for a, b in zip(fields_of(stack), fields_of(more), strict=False))
    assert more.films[-1].floor is stack.surface
    assert stack.surface is stack.films[-1].top


@pytest.mark.parametrize("ny", [1, 3])
def test_carving_raises_the_carved_film_alone(ny):
    stack = layered(ny)
    k = stack.index("high")
    after = stacks.beam_etch(stack, {"high": 1.0}, 0.5)
    for j, (old, new) in enumerate(zip(stack.films, after.films, strict=True)):
        if j != k:
            assert all(getattr(old, name) is getattr(new, name) for name in FIELDS)
    assert film_volume(after.films[k], after.grid) < film_volume(stack.films[k], stack.grid)


@pytest.mark.parametrize(
    "nothing",
    [
        lambda s: s.carve({}),
        lambda s: s.carve({k: np.full(s.grid.shape, -1.0, np.float32) for k in range(len(s.films))}),
        lambda s: s.without(set()),
        lambda s: stacks.beam_etch(s, {"high": 1.0, "low": 0.4}, 0.0),
        lambda s: stacks.beam_etch(s, {}, 10.0),
        lambda s: stacks.wet_etch(s, {}, 10.0),
        lambda s: stacks.wet_etch(s, {"low": 1.0}, 10.0),
    ],
    ids=["empty", "negative", "no films", "no time", "no beam rates", "no wet rates", "buried film"],
)
def test_a_step_that_does_nothing_leaves_every_bit(nothing):
    stack = layered()
    after = nothing(stack)
    assert all(a is b for a, b in zip(fields_of(stack), fields_of(after), strict=True))
    assert after.surface is stack.surface


def test_carving_far_below_the_surface_of_another_place_leaves_the_surface_there():
    """Only where something went does the surface change; elsewhere it keeps its bits."""
    stack = layered()
    x = stack.grid.x
    hole = np.broadcast_to((2.0 - np.abs(x - 4.0)).astype(np.float32), stack.grid.shape)
    after = stack.carve({stack.index("high"): np.ascontiguousarray(hole)})
    assert np.array_equal(after.surface[:, :, 13:], stack.surface[:, :, 13:])
    assert not np.array_equal(after.surface[:, :, 3:5], stack.surface[:, :, 3:5])


def test_a_film_of_which_nothing_is_left_is_dropped_and_the_wafer_never():
    stack = layered()
    everything = np.full(stack.grid.shape, 1.0, np.float32)
    assert [f.name for f in stack.carve({2: everything}).films] == ["wafer", "low"]
    assert [f.name for f in stack.carve(dict.fromkeys(range(3), everything)).films] == ["wafer"]


def test_a_film_thinner_than_a_cell_is_not_dropped_while_any_of_it_is_left():
    """0.1 cell of film, cut away but for 0.3 cell of its width: it is still there."""
    for left in (3.1, 3.5, 3.9, 4.2):
        stack = coat(stacks.bare(stacks.even_grid(12, -3, 6), 0.33), stacks.blank("skin"), 0.1)
        x = stack.grid.x
        keep = np.abs(x - left) - 0.9
        after = stack.carve({1: np.ascontiguousarray(np.broadcast_to(keep.astype(np.float32), stack.grid.shape))})
        assert after.index("skin") == 1
        assert film_volume(after.films[1], after.grid) == pytest.approx(0.1 * 1.8, abs=0.03)


def test_splitting_makes_two_films_of_one_and_keeps_its_volume():
    stack = layered()
    region = np.ascontiguousarray(np.broadcast_to((stack.grid.x - 6.2).astype(np.float32), stack.grid.shape))
    doped = Film("doped", "silicon", "p++", 4, np.empty(0))
    after = stack.split(0, region, doped)
    assert [f.name for f in after.films] == ["wafer", "doped", "low", "high"]
    whole = film_volume(stack.films[0], stack.grid)
    parts = [film_volume(f, after.grid) for f in after.films[:2]]
    assert sum(parts) == pytest.approx(whole, rel=1e-4)
    assert parts[1] == pytest.approx(6.2 * 8.2, rel=0.01)
    assert after.surface is stack.surface
    assert [name for name, _, _ in stacks.layers(after, 3.0)][:1] == ["doped"]
    assert [name for name, _, _ in stacks.layers(after, 9.0)][:1] == ["wafer"]


def test_a_changed_state_changes_no_geometry():
    stack = layered()
    turned = stack.turned(1, state="annealed")
    assert turned.films[1].state == "annealed"
    assert all(a is b for a, b in zip(fields_of(stack), fields_of(turned), strict=True))
    assert turned.surface is stack.surface


def test_volumes_fall_under_carves_and_rise_under_adds():
    """Along a flow of nine operations the solid's volume changes only the way that the operation is meant to."""

    def volume(stack):
        return sum(film_volume(film, stack.grid) for film in stack.films)

    stack = layered()
    steps = [
        (+1, lambda s: spin(s, stacks.blank("level", step=5), 1.0)),
        (-1, lambda s: stacks.beam_etch(s, {"level": 1.0}, 0.4)),
        (-1, lambda s: stacks.wet_etch(s, {"level": 1.0, "high": 0.2}, 0.7)),
        (+1, lambda s: coat(s, stacks.blank("coat", step=6), 0.15)),
        (-1, lambda s: stacks.wet_etch(s, {"coat": 1.0}, 0.1)),
        (+1, lambda s: coat(s, stacks.blank("glass", step=7), 1.5, 0.6)),
        (-1, lambda s: stacks.beam_etch(s, {"glass": 1.0}, 1.5)),
        (-1, lambda s: stacks.stripped(s, "glass")),
    ]
    for way, step in steps:
        after = step(stack)
        assert way * (volume(after) - volume(stack)) >= -1e-3
        stack = after


def test_a_film_that_dips_below_what_it_lies_on_is_caught():
    stack = layered()
    bad = stacks.blank("bad", step=8)
    top = stack.surface.copy()
    top[6, 0, 5] += 0.5
    with pytest.raises(BrokenInvariantError, match="below its floor"):
        stack.add(Film(bad.name, bad.material, None, 8, top))


def sloped_cases():
    ridge = stacks.trenched(stacks.even_grid(40, -20, 16), lambda x, z: np.hypot(x - 20.2, z + 0.3) - 10.0)
    yield "flat", coat(stacks.bare(stacks.even_grid(12, -8, 12), 0.37), stacks.blank("film"), 2.2)
    yield "ridge", coat(ridge, stacks.blank("film"), 3.0)
    yield "step", coat(layered(nx=50), stacks.blank("film", step=9), 2.4)
    yield "etched ridge", stacks.wet_etch(coat(ridge, stacks.blank("film"), 4.0), {"film": 1.0}, 1.7)
    yield "beam", stacks.beam_etch(layered(nx=50), {"high": 1.0}, 0.6)


@pytest.mark.parametrize(("name", "stack"), list(sloped_cases()), ids=[name for name, _ in sloped_cases()])
def test_the_surface_slopes_by_one_on_its_smooth_parts(name, stack):
    """|gradient| within 1 % of 1, three cells to either side: at 98 of 100 samples, and none beyond 5 %.

    What counts as smooth is seen from the field itself, so a few samples beside a bend get in.
    """
    off, smooth = off_gradient(stack.surface, stack.grid)
    assert smooth.sum() > 30
    assert np.mean(off[smooth] < 0.01) > 0.98
    assert off[smooth].max() < 0.05
