"""Polishing leaves a level plane: at a depth below the highest point, or at a film's top."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.registry import step_kinds
from flowemu.stack.wafer import Wafer
from tests import stacks
from tests.unit.steps.shop import cut_of, do, layered


def filled() -> Wafer:
    """A block 2 um high up to x = 10.4 under 3.1 um of a conformal film; tops at 5.3 and 3.3 um."""
    stack = layered(("block", "nitride", None, 2.0), nx=24).stack
    stack = stacks.stripped(stacks.beam_etch(stacks.printed(stack, stack.grid.x - 10.4), {"block": 1.0}, 2.2))
    given = {"film": "film", "material": "polysilicon", "thickness": "3.1 um", "method": "lpcvd"}
    return do(Wafer(stack), "deposit", 3, **given)


@pytest.mark.parametrize("depth", [0.4, 0.8, 1.3, 2.6])
def test_a_depth_counts_from_the_highest_point(depth: float) -> None:
    """The plane lies at 5.3 um less the depth, to 0.01 cell; what is lower stays."""
    stack = do(filled(), "polish", depth=f"{depth} um").stack
    for x, top in ((3.5, 5.3), (21.5, 3.3)):
        assert stacks.layers(stack, x)[-1][2] == pytest.approx(min(top, 5.3 - depth), abs=0.01)


@pytest.mark.parametrize("height", [0.2, 0.45, 0.8])
def test_to_a_film_just_exposes_it(height: float) -> None:
    """The plane lies at the block's top: nothing above it, all of the block left, to 0.02 cell."""
    wafer = layered(("block", "nitride", None, 2.0), ("cap", "polysilicon", "n+", 1.6), nx=12, height=height)
    stack = do(wafer, "polish", to="block").stack
    assert stacks.layers(stack, 6.0)[-1][2] == pytest.approx(height + 2.0, abs=0.02)
    assert stacks.thickness(stack, "block", 6.0) == pytest.approx(2.0, abs=0.02)


def test_a_film_beside_the_block_is_cut_level_with_it() -> None:
    stack = do(filled(), "polish", to="block").stack
    assert stacks.layers(stack, 21.5)[-1] == ("film", pytest.approx(0.2, abs=0.02), pytest.approx(2.2, abs=0.02))
    assert [name for name, _, _ in stacks.layers(stack, 3.5)] == ["wafer", "block"]


@pytest.mark.parametrize("thickness", [0.2, 0.6])
def test_a_film_thinner_than_a_cell_is_exposed_too(thickness: float) -> None:
    wafer = layered(("skin", "nitride", None, thickness), ("cap", "polysilicon", "n+", 2.3))
    stack = do(wafer, "polish", to="skin").stack
    assert stacks.thickness(stack, "skin", 6.0) == pytest.approx(thickness, abs=0.02)
    assert stacks.thickness(stack, "cap", 6.0) == pytest.approx(0.0, abs=0.02)


def test_what_went_is_on_record() -> None:
    cut = cut_of(do(layered(("film", "nitride", None, 2.0)), "polish", depth="0.5 um"))
    (loss,) = cut.losses
    assert (cut.step, cut.verb, loss.film, loss.meant, loss.through) == (9, "polish", "film", True, False)
    assert loss.volume == pytest.approx(0.5 * 12, rel=0.01)


def test_a_film_that_is_not_there_is_refused() -> None:
    with pytest.raises(StepError, match="there is no film 'lost' on the wafer"):
        do(layered(), "polish", to="lost")


@pytest.mark.parametrize("given", [{}, {"depth": "1 um", "to": "film"}])
def test_both_or_neither_of_depth_and_film_are_refused(given: dict[str, str]) -> None:
    with pytest.raises(ValueError, match="expected exactly one of depth, to"):
        step_kinds()["polish"].settings.model_validate(given)


def test_a_polish_to_the_topmost_film_takes_next_to_nothing() -> None:
    """The plane lies at the film's own top: its surface moves by less than 1e-4 cell."""
    before = layered(("film", "nitride", None, 2.0))
    after = do(before, "polish", to="film")
    assert stacks.thickness(after.stack, "film", 6.0) == pytest.approx(2.0, abs=1e-4)
    near = np.abs(before.stack.surface) < 3.0
    assert np.abs(after.stack.surface - before.stack.surface)[near].max() < 1e-4


def test_a_depth_of_nothing_is_refused() -> None:
    with pytest.raises(ValueError, match="'0 um' is not above zero"):
        step_kinds()["polish"].settings.model_validate({"depth": "0 um"})
