"""Films that are spun level and planes that are polished, against closed forms."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.stack.wafer import Cut, Wafer
from flowemu.steps.models.coating import coat, spin, surface_heights
from flowemu.steps.models.polish import polish_to
from tests import stacks

TOOLS = SimpleNamespace(step=3, verb="polish")


def ridge(height: float = 3.0, low: float = 10.2, high: float = 19.8):
    """A ridge of film `base` between two edges on a flat wafer whose front is at 0.2."""
    grid = stacks.even_grid(32, -4, 14)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("base"), height)
    stack = stacks.printed(stack, np.maximum(low - grid.x, grid.x - high))
    return stacks.stripped(stacks.beam_etch(stack, {"base": 1.0}, height))


def test_a_spun_film_is_level_and_lies_above_the_mean():
    """Full planarisation: one height everywhere, thickness above the mean surface, to 0.05 cell (columns are whole)."""
    stack = ridge()
    level = surface_heights(stack).mean() + 2.5
    coated = spin(stack, stacks.blank("resist"), 2.5)
    tops = [stacks.layers(coated, x)[-1][2] for x in (2.0, 9.9, 15.0, 20.1, 30.0)]
    assert tops == pytest.approx([level] * 5, abs=0.01)
    low, high = stacks.thickness(coated, "resist", 2.0), stacks.thickness(coated, "resist", 15.0)
    assert low - high == pytest.approx(3.0, abs=0.02)
    mean = 0.2 + 3.0 * 9.6 / 32
    assert level == pytest.approx(mean + 2.5, abs=0.2)


@pytest.mark.parametrize("share", [0.0, 0.5, 0.8])
def test_planarisation_levels_its_share(share):
    """Far from the edges of a wide step the top follows (1 - share) of it, to 0.1 cell."""
    grid = stacks.even_grid(120, -4, 14)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("base"), 3.0)
    stack = stacks.printed(stack, grid.x - 60.2)
    stack = stacks.stripped(stacks.beam_etch(stack, {"base": 1.0}, 3.0))
    coated = spin(stack, stacks.blank("film"), 4.0, share, length=6.0)
    step = stacks.layers(coated, 20.0)[-1][2] - stacks.layers(coated, 100.0)[-1][2]
    assert step == pytest.approx((1 - share) * 3.0, abs=0.1)


def test_a_spun_film_fills_a_gap_and_leaves_no_void():
    """A groove 3 wide and 3 deep is full to its floor."""
    grid = stacks.even_grid(24, -4, 14)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("base"), 3.0)
    stack = stacks.printed(stack, 1.5 - np.abs(grid.x - 12.1))
    stack = stacks.stripped(stacks.beam_etch(stack, {"base": 1.0}, 3.0))
    found = stacks.layers(spin(stack, stacks.blank("film"), 2.0), 12.1)
    assert [name for name, _, _ in found] == ["wafer", "film"]
    assert found[1][1] == pytest.approx(found[0][2], abs=1e-6)


@pytest.mark.parametrize("depth", [0.1, 0.8, 3.7])
def test_a_polish_leaves_a_plane_at_its_depth(depth):
    """Whatever the films: every column ends at the highest point less the depth, or lower; to 0.01 cell."""
    stack = coat(ridge(), stacks.blank("fill"), 2.0)
    after = polish_to(Wafer(stack), depth, None, TOOLS).stack
    plane = 0.2 + 3.0 + 2.0 - depth
    for x in (2.0, 8.0, 15.0, 25.0):
        before = stacks.layers(stack, x)[-1][2]
        assert stacks.layers(after, x)[-1][2] == pytest.approx(min(before, plane), abs=0.01)


def test_a_polish_to_a_film_just_exposes_it():
    """The plane is the film's highest point; what lies lower is not touched, and the film keeps its thickness."""
    stack = coat(ridge(), stacks.blank("fill"), 4.5)
    wafer = polish_to(Wafer(stack), None, "base", TOOLS)
    assert [name for name, _, _ in stacks.layers(wafer.stack, 15.0)] == ["wafer", "base"]
    assert stacks.thickness(wafer.stack, "base", 15.0) == pytest.approx(3.0, abs=0.01)
    assert stacks.layers(wafer.stack, 3.0)[-1][2] == pytest.approx(3.2, abs=0.01)
    (cut,) = [event for event in wafer.events if isinstance(event, Cut)]
    assert {loss.film for loss in cut.losses} == {"fill"}


@pytest.mark.parametrize("thickness", [0.1, 0.4])
def test_a_polish_to_a_film_thinner_than_a_cell_finds_its_top(thickness):
    """The top of a film without a sample in it, to 0.01 cell."""
    for height in (0.1, 0.45, 0.9):
        stack = coat(stacks.bare(stacks.even_grid(6, -4, 10), height), stacks.blank("stop"), thickness)
        stack = coat(stack, stacks.blank("fill"), 2.0)
        after = polish_to(Wafer(stack), None, "stop", TOOLS).stack
        assert stacks.layers(after, 3.0)[-1][2] == pytest.approx(height + thickness, abs=0.01)
        assert after.index("fill") is None


def test_a_polish_to_a_film_that_is_not_there_is_refused():
    with pytest.raises(StepError, match="no film 'lost'"):
        polish_to(Wafer(ridge()), None, "lost", TOOLS)
