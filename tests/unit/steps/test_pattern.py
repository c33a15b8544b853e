"""Patterns as a step: what is opened, bias, shift, rounding, the resist's wall, trenches, and what is refused."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.registry import step_kinds
from flowemu.stack.invariants import off_gradient
from flowemu.stack.wafer import Laid, Printed, Unresolved, Wafer
from tests import stacks
from tests.unit.steps.shop import box, do, layered

HOLE = {"HOLE": [box(8.3, 15.4)]}


def printed(wafer: Wafer | None = None, **settings: Any) -> Wafer:
    """A flat wafer with 2 um of resist and the mask HOLE, drawn from 8.3 to 15.4, printed in it."""
    wafer = layered(nx=24) if wafer is None else wafer
    return do(wafer, "pattern", masks=HOLE, **{"mask": "HOLE", "resist": "2 um", **settings})


def edges(wafer: Wafer, height: float = 1.2) -> list[float]:
    """Where the resist begins and ends at this height, um."""
    gone = stacks.film_of(wafer.stack, "resist").gone
    assert gone is not None
    line = stacks.value_at(gone, wafer.stack.grid, wafer.stack.grid.x, np.full(wafer.stack.grid.nx, height))
    return [float(x) for x in stacks.crossings(line, wafer.stack.grid.x)]


@pytest.mark.parametrize(
    ("area", "there", "bare"),
    [
        ({"open": "drawn"}, 4.5, 12.5), ({"open": "undrawn"}, 12.5, 4.5),
        ({"keep": "drawn"}, 12.5, 4.5), ({"keep": "undrawn"}, 4.5, 12.5),
    ],
)  # fmt: skip
def test_what_is_opened_is_bare_and_the_rest_covered(area: dict[str, str], there: float, bare: float) -> None:
    """The edges are those drawn, to 0.02 cell; the resist has its thickness up to them."""
    wafer = printed(**area)
    assert edges(wafer) == pytest.approx([8.3, 15.4], abs=0.02)
    assert stacks.thickness(wafer.stack, "resist", there) == pytest.approx(2.0, abs=0.01)
    assert stacks.thickness(wafer.stack, "resist", bare) == 0.0


@pytest.mark.parametrize("bias", [-0.4, 0.3])
def test_a_bias_grows_the_resist_on_every_edge(bias: float) -> None:
    """Above zero the resist gets wider: a line of it grows, an opening in it shrinks; 0.02 cell."""
    line, hole = edges(printed(keep="drawn", bias=f"{bias} um")), edges(printed(open="drawn", bias=f"{bias} um"))
    assert line == pytest.approx([8.3 - bias, 15.4 + bias], abs=0.02)
    assert hole == pytest.approx([8.3 + bias, 15.4 - bias], abs=0.02)


def test_a_shift_moves_the_edges() -> None:
    assert edges(printed(open="drawn", shift=["0.7 um", "0 um"])) == pytest.approx([9.0, 16.1], abs=0.02)


@pytest.mark.parametrize("wall", [90, 80, 70])
def test_the_wall_leans_out_below_its_upper_edge(wall: float) -> None:
    """Below 90 degrees the resist is wider at its foot, which stays at the drawn edge: 0.05 cell a height."""
    wafer = printed(keep="drawn", wall=f"{wall} deg")
    for height in (0.7, 1.2, 1.7):
        away = (height - 0.2) / np.tan(np.radians(wall))
        assert edges(wafer, height) == pytest.approx([8.3 + away, 15.4 - away], abs=0.05)


def test_rounding_takes_the_corners_off() -> None:
    """A square of 12 with a radius of 3: the corner draws back by 3 (sqrt 2 - 1) = 1.24, to 0.1; sides stay."""
    masks = {"PAD": [box(6.2, 18.2, 6.2, 18.2)]}
    wafer = do(layered(nx=24, ny=24), "pattern", masks=masks, mask="PAD", keep="drawn", resist="2 um", rounding="3 um")
    gone = stacks.film_of(wafer.stack, "resist").gone
    assert gone is not None
    plane = gone[5]
    diagonal = stacks.crossings(np.diagonal(plane), wafer.stack.grid.x)
    back = 3 * (1 - np.sqrt(0.5))
    assert diagonal == pytest.approx([6.2 + back, 18.2 - back], abs=0.1)
    assert stacks.crossings(plane[12], wafer.stack.grid.x) == pytest.approx([6.2, 18.2], abs=0.02)


def test_the_top_is_level_so_that_resist_is_thinner_over_high_places() -> None:
    """3 um above the mean of 2.2 um (over 12 columns) and 0.2 um (over 12): 2 um over the block, 4 um beside it."""
    stack = layered(("block", "nitride", None, 2.0), nx=24).stack
    stack = stacks.stripped(stacks.beam_etch(stacks.printed(stack, stack.grid.x - 12.0), {"block": 1.0}, 2.2))
    wafer = printed(Wafer(stack), open="drawn", resist="3 um")
    assert stacks.thickness(wafer.stack, "resist", 3.5) == pytest.approx(2.0, abs=0.05)
    assert stacks.thickness(wafer.stack, "resist", 20.5) == pytest.approx(4.0, abs=0.05)


def test_developing_clears_trenches_to_their_floor() -> None:
    """Resist 3 um deep in a trench is gone where the mask opens it, and fills it where it does not."""
    stack = layered(("block", "nitride", None, 3.0), nx=24).stack
    cut = stacks.printed(stack, np.maximum(2.4 - np.abs(stack.grid.x - 12.0), 2.4 - np.abs(stack.grid.x - 20.0)))
    wafer = printed(Wafer(stacks.stripped(stacks.beam_etch(cut, {"block": 1.0}, 3.3))), open="drawn")
    assert [name for name, _, _ in stacks.layers(wafer.stack, 12.0)] == ["wafer"]
    assert [name for name, _, _ in stacks.layers(wafer.stack, 20.0)] == ["wafer", "resist"]


def test_the_resist_lies_on_the_film_below_and_its_edge_is_a_distance() -> None:
    wafer = printed(open="drawn")
    resist = stacks.film_of(wafer.stack, "resist")
    assert resist.floor is layered(nx=24).stack.surface or np.array_equal(resist.floor, layered(nx=24).stack.surface)
    assert resist.gone is not None
    off, smooth = off_gradient(resist.gone, wafer.stack.grid)
    assert smooth.sum() > 50
    assert off[smooth].max() < 0.01


def test_a_second_coat_is_a_film_of_its_own_and_the_last_mask_is_known() -> None:
    wafer = printed(printed(open="drawn"), keep="drawn", resist={"thickness": "4 um", "tone": "negative"})
    assert [film.name for film in wafer.stack.films] == ["wafer", "resist", "resist"]
    assert [event.mask for event in wafer.events if isinstance(event, Printed)] == ["HOLE", "HOLE"]
    assert wafer.printed is not None
    assert wafer.printed.opened[0, 12] == pytest.approx(-2.9, abs=1e-5)
    assert [event.film for event in wafer.events if isinstance(event, Laid)] == ["resist", "resist"]


def test_a_line_too_narrow_for_the_grid_is_told() -> None:
    masks = {"LINE": [box(4.0, 5.5, 2.0, 20.0)]}
    wafer = do(layered(nx=24, ny=24), "pattern", masks=masks, mask="LINE", keep="drawn", resist="2 um")
    (event,) = [event for event in wafer.events if isinstance(event, Unresolved)]
    assert re.fullmatch(r"mask LINE has a line of 1\.[45]\d* um, less than two cells of 1 um", event.text)
    assert event.size == pytest.approx(1.5, abs=0.05)
    assert event.at is not None
    assert event.at[0] == pytest.approx(4.75, abs=0.5)


def test_a_back_mask_and_an_unknown_resist_are_refused() -> None:
    with pytest.raises(StepError, match=re.escape("side: back is not built yet; the grid reaches the front alone")):
        printed(open="drawn", side="back")
    with pytest.raises(StepError, match="waxx"):
        printed(open="drawn", resist={"thickness": "2 um", "material": "waxx"})


@pytest.mark.parametrize(
    ("area", "found"), [({}, ""), ({"open": "drawn", "keep": "drawn"}, "; found open and keep")]
)
def test_both_or_neither_of_open_and_keep_are_refused(area: dict[str, str], found: str) -> None:
    with pytest.raises(ValueError, match=re.escape(f"expected exactly one of open, keep{found}")):
        step_kinds()["pattern"].settings.model_validate({"mask": "HOLE", "resist": "2 um", **area})
