"""What a vertical beam takes from a film that is worked on near the beam alone."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.steps.models.coating import coat, spin
from tests import stacks


def two_islands(masked: bool):
    """A film on either end of 90 cells of base, the right one under resist, or both bare."""
    grid = stacks.even_grid(90, -3, 9)
    stack = stacks.printed(
        coat(stacks.bare(grid, 0.2), stacks.blank("film"), 1.3), np.minimum(grid.x - 12.3, 75.6 - grid.x)
    )
    stack = stacks.stripped(stacks.beam_etch(stack, {"film": 1.0}, 1.5))
    return stacks.printed(stack, 70.0 - grid.x) if masked else stack


def test_an_island_that_goes_leaves_the_one_that_the_resist_covers_far_away() -> None:
    before = two_islands(masked=True)
    after = stacks.stripped(stacks.beam_etch(before, {"film": 1.0}, 2.0))
    assert stacks.thickness(after, "film", 5.5) == 0.0
    assert stacks.thickness(after, "film", 85.5) == pytest.approx(1.3, abs=1e-5)


def test_islands_that_all_go_leave_nothing() -> None:
    assert stacks.beam_etch(two_islands(masked=False), {"film": 1.0}, 2.0).index("film") is None


def test_a_film_that_the_beam_does_not_get_to_stays_to_the_bit() -> None:
    grid = stacks.even_grid(30, -3, 12)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("film"), 1.3)
    stack = stacks.printed(stack, grid.x - 15.2, thickness=2.0)
    for time in (0.5, 1.9):
        after = stacks.beam_etch(stack, {"film": 1.0, "wafer": 1.0, "resist": 0.0}, 0.6 * time)
        assert after.films[0] is stack.films[0]
    untouched = stacks.beam_etch(stack, {"wafer": 1.0, "resist": 1.0}, 1.5)
    assert untouched.films[:2] == stack.films[:2]
    np.testing.assert_array_equal(untouched.films[1].top, stack.films[1].top)


@pytest.mark.parametrize("masked", [True, False])
@pytest.mark.parametrize("time", [1.0, 2.9, 3.2])
def test_a_film_under_what_is_left_of_a_level_cover_keeps_its_thickness(masked: bool, time: float) -> None:
    """Over a mesa the cover is thin and the film below it is cut; in the valley the beam ends in the cover.

    At 2.9 s it ends less than a cell above the film. With and without an opening about both.
    """
    grid = stacks.even_grid(48, -3, 16)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("base"), 3.0)
    stack = stacks.stripped(stacks.beam_etch(stacks.printed(stack, 24.3 - grid.x), {"base": 1.0}, 3.05))
    stack = spin(coat(stack, stacks.blank("lower"), 1.0), stacks.blank("cover"), 2.1)
    thin, thick = stacks.thickness(stack, "cover", 34.5), stacks.thickness(stack, "cover", 14.5)
    assert thin < 0.7
    assert thick - thin == pytest.approx(3.0, abs=0.01)
    if masked:
        stack = stacks.printed(stack, np.minimum(grid.x - 8.2, 40.4 - grid.x))
    after = stacks.beam_etch(stack, {"cover": 1.0, "lower": 1.0}, time)
    for x in (10.5, 14.5, 18.5):
        assert stacks.thickness(after, "lower", x) == pytest.approx(1.0, abs=1e-4)
        assert stacks.thickness(after, "cover", x) == pytest.approx(thick - time, abs=0.01)
    assert stacks.thickness(after, "lower", 34.5) == pytest.approx(max(1.0 - (time - thin), 0.0), abs=0.01)
