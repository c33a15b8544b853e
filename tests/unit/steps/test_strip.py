"""Stripping takes what the open space reaches, whole pieces of it, and leaves what is buried."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.registry import step_kinds
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Coat, Wafer
from flowemu.steps.models.coating import coat
from tests import stacks
from tests.unit.steps.shop import cut_of, do


def two_pads(thickness: float, height: float) -> FilmStack:
    """Two pads of film `pad`, at 4 to 10 and 16 to 24; the second one sealed under a lid."""
    grid = stacks.even_grid(30, -4, 12)
    stack = coat(stacks.bare(grid, height), stacks.blank("pad"), thickness)
    stack = stacks.printed(stack, np.minimum(np.abs(grid.x - 7.0) - 3.0, np.abs(grid.x - 20.0) - 4.0))
    stack = stacks.stripped(stacks.beam_etch(stack, {"pad": 1.0}, 1.2 * thickness))
    stack = coat(stack, stacks.blank("lid"), 1.2)
    stack = stacks.printed(stack, 13.0 - grid.x)
    return stacks.stripped(stacks.beam_etch(stack, {"lid": 1.0}, 1.5 + thickness))


@pytest.mark.parametrize("thickness", [0.3, 0.8, 2.0])
@pytest.mark.parametrize("height", [0.2, 0.45])
def test_the_bare_piece_goes_and_the_buried_one_stays(thickness: float, height: float) -> None:
    """However thin: the pad under the lid keeps its thickness, the bare one leaves nothing."""
    wafer = do(Wafer(two_pads(thickness, height)), "strip", film="pad")
    assert stacks.thickness(wafer.stack, "pad", 20.3) == pytest.approx(thickness, abs=0.02)
    for x in (4.5, 7.0, 9.5):
        assert stacks.thickness(wafer.stack, "pad", x) == 0.0
    assert stacks.thickness(wafer.stack, "lid", 20.3) == pytest.approx(1.2, abs=0.02)


def test_all_coats_of_resist_go_and_nothing_else_changes() -> None:
    grid = stacks.even_grid(20, -4, 14)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("film"), 1.0)
    once = stacks.printed(stack, grid.x - 12.0, thickness=1.5)
    twice = stacks.printed(once, grid.x - 8.0, thickness=4.0)
    wafer = do(Wafer(twice), "strip", 7, film="resist", with_="o2 plasma")
    assert [film.name for film in wafer.stack.films] == ["wafer", "film"]
    assert all(a is b for a, b in zip(wafer.stack.films, stack.films, strict=True))
    cut = cut_of(wafer)
    assert (cut.step, cut.agent, {loss.film for loss in cut.losses}) == (7, "o2 plasma", {"resist"})
    assert wafer.printed is None


def test_the_surface_is_as_it_was_before_the_resist() -> None:
    """Where resist lay on a flat the surface comes back to 1e-4 cell within three cells of it."""
    grid = stacks.even_grid(20, -4, 14)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("film"), 1.0)
    after = do(Wafer(stacks.printed(stack, grid.x - 12.0)), "strip", film="resist").stack
    near = np.abs(stack.surface) < 3.0
    assert np.abs(after.surface - stack.surface)[near].max() < 1e-4


def test_the_film_goes_from_the_back_as_well() -> None:
    stack = coat(stacks.bare(stacks.even_grid(6, -4, 8)), stacks.blank("glass"), 1.0)
    back = (Coat("nitride", "nitride", None, 0.5, 1), Coat("glass", "psg", None, 1.0, 2))
    assert do(Wafer(stack, back=back), "strip", film="glass").back == back[:1]


def test_a_film_that_is_not_there_or_buried_is_refused() -> None:
    stack = coat(coat(stacks.bare(stacks.even_grid(6, -4, 8)), stacks.blank("low"), 1.0), stacks.blank("high"), 1.0)
    with pytest.raises(StepError, match="there is no film 'lost' on the wafer"):
        do(Wafer(stack), "strip", film="lost")
    with pytest.raises(StepError, match="film 'low' is buried; nothing of it can be reached"):
        do(Wafer(stack), "strip", film="low")


def test_a_bare_word_stands_for_the_film() -> None:
    assert step_kinds()["strip"].short == "film"
