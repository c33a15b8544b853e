"""Pieces, bodies and open space: by hand, beside scipy's labels, and with boundaries right on the samples."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import ndimage

from flowemu.stack.bodies import find_parts
from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.coating import coat
from tests import stacks


def released_plate(heights: tuple[float, ...], anchored: bool, cell: float = 1.0) -> FilmStack:
    """Base, gap, lower and upper film of a plate of these thicknesses in cells, released; held at x < 6 or not."""
    base, gap, lower, upper = (cell * h for h in heights)
    grid = stacks.even_grid(30, -4 * cell, 10 * cell, cell)
    stack = stacks.bare(grid)
    if base:
        stack = coat(stack, stacks.blank("base"), base)
    stack = coat(stack, stacks.blank("sac"), gap)
    if anchored:
        stack = stacks.printed(stack, 6.3 * cell - grid.x)
        stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0}, 1.05 * gap))
    stack = coat(coat(stack, stacks.blank("lower"), lower), stacks.blank("upper"), upper)
    stack = stacks.printed(stack, np.abs(grid.x - 12 * cell) - 10 * cell)
    stack = stacks.stripped(stacks.beam_etch(stack, {"lower": 1.0, "upper": 1.0}, 1.1 * (lower + upper) + gap))
    return stack.carve(stacks.front(stack, {"sac": 1.0}).removed(60.0 * cell))


ROUND = [
    (0.5, 1.0, 0.75, 0.25), (0.5, 2.0, 0.5, 0.5), (0.5, 1.0, 0.25, 0.75), (0.0, 1.25, 0.25, 0.5), (0.5, 0.5, 0.5, 0.5),
]  # fmt: skip


@pytest.mark.parametrize("heights", ROUND)
@pytest.mark.parametrize("anchored", [True, False])
@pytest.mark.parametrize("lift", [0.0, 1e-4, -1e-4])
def test_boundaries_on_the_samples_are_like_any_others(heights, anchored, lift):
    """Round numbers put films' faces on sample centres, to the bit or nearly: what is held or loose does not change."""
    heights = (heights[0], heights[1] + lift, *heights[2:])
    stack = released_plate(heights, anchored)
    assert stack.index("sac") is None
    places = {"lower": ("lower", (12.2, 0.5)), "upper": ("upper", (12.2, 0.5))}
    parts = find_parts(stack, places)
    assert {part.name: part.held for part in parts} == {"lower": anchored, "upper": anchored}
    found = [name for name, low, high in stacks.layers(stack, 12.2) if high - low > 0.01]
    assert found == ["wafer", *(["base"] if heights[0] else []), "lower", "upper"]


@pytest.mark.parametrize("seed", range(4))
def test_bodies_agree_with_scipy_where_all_is_thick(seed):
    """Smooth random solids: bodies are scipy's labels of the samples, joined across the six tetrahedra's edges."""
    rng = np.random.default_rng(seed)
    noise = ndimage.gaussian_filter(rng.normal(size=(14, 12, 13)), 1.6)
    field = ((noise - np.quantile(noise, 0.35)) / noise.std()).astype(np.float32)
    grid = stacks.even_grid(13, 0, 14, ny=12)
    stack = FilmStack(grid, (Film("wafer", "silicon", None, 0, field),), field)
    t = stack.topology
    along = np.zeros((3, 3, 3), bool)
    for z, y, x in [(0, 0, 0), (0, 0, 1), (0, 1, 0), (1, 0, 0), (0, 1, 1), (1, 0, 1), (1, 1, 0), (1, 1, 1)]:
        along[1 + z, 1 + y, 1 + x] = along[1 - z, 1 - y, 1 - x] = True
    labels, count = ndimage.label(field < 0, structure=along)
    ours = t.body[: t.code.size].reshape(t.code.shape)
    pairs = {(a, b) for a, b in zip(labels[field < 0].tolist(), ours[field < 0].tolist(), strict=True)}
    assert len(pairs) == count == len({b for _, b in pairs})
    voids, void_count = ndimage.label(field >= 0, structure=along)
    pairs = {(a, b) for a, b in zip(voids[field >= 0].tolist(), ours[field >= 0].tolist(), strict=True)}
    assert len(pairs) == void_count == len({b for _, b in pairs})


def cavity(hole: float) -> FilmStack:
    """A cavity 3 high under a roof of 1 with a hole this wide above it; no hole at 0."""
    grid = stacks.even_grid(30, -4, 12)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("sac"), 3.0)
    stack = stacks.printed(stack, np.abs(grid.x - 15.0) - 8.0)
    stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0}, 3.1))
    stack = coat(stack, stacks.blank("roof"), 1.0)
    if hole:
        through = np.broadcast_to((hole / 2 - np.abs(grid.x - 15.4)).astype(np.float32), grid.shape)
        stack = stack.carve({stack.index("roof"): np.ascontiguousarray(through)})
    return stack.without({stack.index("sac")})


@pytest.mark.parametrize(("hole", "is_open"), [(0.0, False), (0.4, True), (1.0, True), (3.0, True)])
def test_a_void_is_open_if_the_front_reaches_it_through_a_hole_of_any_width(hole, is_open):
    stack = cavity(hole)
    t = stack.topology
    inside = t.on_grid(t.open_space)[6, 0, 12]
    assert t.on_grid(t.code)[6, 0, 12] < 0
    assert bool(inside) is is_open


def test_everything_is_open_above_and_nothing_within():
    stack = cavity(0.0)
    t = stack.topology
    opened = t.on_grid(t.open_space)
    assert opened[-1].all()
    assert not opened[t.on_grid(t.code) >= 0].any()


@pytest.mark.parametrize("low", [0.2, 0.45, 0.8])
@pytest.mark.parametrize("gap", [0.2, 0.4, 0.6, 0.8, 1.2])
def test_a_gap_opened_under_a_film_parts_it_from_what_it_was_laid_on(low, gap):
    """The film below is lowered by the gap on its whole top: the upper one is loose, its foot where it was laid."""
    stack = coat(coat(stacks.bare(stacks.even_grid(8, -3, 8), low), stacks.blank("a"), 2.0), stacks.blank("b"), 1.5)
    level = stack.grid.z - (low + 2.0 - gap)
    removed = np.broadcast_to(level[:, None, None].astype(np.float32), stack.grid.shape)
    after = stack.carve({1: np.ascontiguousarray(removed)})
    (part,) = find_parts(after, {"b": ("b", (4.0, 0.5))})
    assert not part.held
    assert stacks.layers(after, 4.0)[-1][1] == pytest.approx(low + 2.0, abs=1e-5)
