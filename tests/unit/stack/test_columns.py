"""Films under a point, and thicknesses in every column."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.columns import thickness_maps, topmost
from flowemu.stack.measure import film_volume
from flowemu.steps.models.coating import coat
from tests import stacks


def stair(ny: int = 4):
    """Films of 1.3, 0.2 and 2.4, the upper two only beyond x = 9.3."""
    grid = stacks.even_grid(20, -4, 12, ny=ny)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("low"), 1.3)
    stack = coat(coat(stack, stacks.blank("skin"), 0.2), stacks.blank("high"), 2.4)
    stack = stacks.printed(stack, np.broadcast_to(9.3 - grid.x, (ny, 20)))
    return stacks.stripped(stacks.beam_etch(stack, {"high": 1.0, "skin": 1.0}, 2.7))


@pytest.mark.parametrize("ny", [1, 4])
def test_the_films_under_a_point_come_lowest_first_and_touch(ny):
    stack = stair(ny)
    found = stacks.layers(stack, 15.2, 0.5)
    assert [name for name, _, _ in found] == ["wafer", "low", "skin", "high"]
    assert [low for _, low, _ in found[1:]] == pytest.approx([0.2, 1.5, 1.7], abs=1e-5)
    assert [low for _, low, _ in found[1:]] == [high for _, _, high in found[:-1]]
    assert [name for name, _, _ in stacks.layers(stack, 4.0, 0.5)] == ["wafer", "low"]


def test_points_outside_the_samples_are_carried_in():
    stack = stair()
    assert stacks.layers(stack, 0.0, 0.0) == stacks.layers(stack, 0.5, 0.5)
    assert stacks.layers(stack, 20.0, 4.0) == stacks.layers(stack, 19.5, 3.5)


def test_maps_agree_with_points_and_with_volumes():
    stack = stair()
    for name in ("low", "skin", "high"):
        k = stack.index(name)
        found = thickness_maps(stack)[k]
        assert found.shape == (4, 20)
        assert found[2, 15] == pytest.approx(stacks.thickness(stack, name, 15.5, 2.5), abs=1e-5)
        assert found.sum() == pytest.approx(film_volume(stack.films[k], stack.grid), rel=0.05)


def test_what_is_seen_from_above():
    stack = stair()
    seen = topmost(stack)
    assert set(seen[:, :9].ravel()) == {stack.index("low")}
    assert set(seen[:, 10:].ravel()) == {stack.index("high")}
