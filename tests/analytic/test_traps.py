"""Four traps of fields on a grid, each of which has caught a prototype."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels.redistance import redistance
from flowemu.steps.models.coating import coat
from tests import stacks


def stepped(thickness: float = 1.0):
    """A nitride over a step, under glass, under a cap with a slit."""
    grid = stacks.even_grid(40, -6, 18)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("base"), 3.1)
    stack = stacks.printed(stack, grid.x - 20.3)
    stack = stacks.stripped(stacks.beam_etch(stack, {"base": 1.0}, 3.1))
    stack = coat(stack, stacks.blank("nitride"), thickness)
    stack = coat(stack, stacks.blank("glass"), 2.7)
    stack = coat(stack, stacks.blank("cap"), 1.3)
    stack = stacks.printed(stack, 8.2 - grid.x)
    return stacks.stripped(stacks.beam_etch(stack, {"cap": 1.0}, 1.5))


@pytest.mark.parametrize("time", [3.0, 10.0, 60.0])
def test_what_is_merely_wetted_is_not_touched(time):
    """Trap 1. Films at rate 0 keep their very arrays, and their thickness to the bit, however long the etch."""
    stack = stepped()
    after = stacks.wet_etch(stack, {"glass": 1.0}, time)
    for name in ("wafer", "base", "nitride", "cap"):
        old, new = stacks.film_of(stack, name), stacks.film_of(after, name)
        assert new.top is old.top
        assert new.floor is old.floor
        assert new.gone is old.gone
    before = [layer for layer in stacks.layers(stack, 30.0) if layer[0] != "glass"]
    assert [layer for layer in stacks.layers(after, 30.0) if layer[0] != "glass"] == before


@pytest.mark.parametrize("mask", [0.1, 0.4, 0.8])
def test_a_thin_mask_does_not_leak_and_a_thin_film_is_not_blocked(mask):
    """Trap 2. Cells shared by a thin mask, a thin film and what lies below: the film goes, the rest is sealed off."""
    for offset in (0.05, 0.35, 0.65, 0.95):
        grid = stacks.even_grid(30, -4, 10)
        stack = coat(stacks.bare(grid, offset), stacks.blank("lower"), 0.6)
        stack = coat(stack, stacks.blank("stop"), mask)
        stack = coat(stack, stacks.blank("upper"), 0.6)
        stack = coat(stack, stacks.blank("lid"), mask)
        stack = stacks.printed(stack, 5.3 - grid.x)
        stack = stacks.stripped(stacks.beam_etch(stack, {"lid": 1.0}, 1.2 * mask))
        arrival = stacks.front(stack, {"lower": 1.0, "upper": 1.0})
        assert np.isfinite(arrival.of_film(stack.index("upper"))[1]).all()
        assert not np.isfinite(arrival.of_film(stack.index("lower"))[1]).any()
        after = stack.carve(arrival.removed(40.0))
        assert [name for name, _, _ in stacks.layers(after, 20.0)] == ["wafer", "lower", "stop", "lid"]


def test_a_buried_interface_leaves_no_crease_in_the_surface():
    """Trap 3. The surface over a buried interface slopes as if the interface were not there.

    The minimum of the films' own distances dips to zero on the interface; the stack's surface falls with slope 1.
    """
    grid = stacks.even_grid(8, -8, 8)
    stack = coat(stacks.bare(grid, -1.3), stacks.blank("film"), 2.6)
    stack = stacks.beam_etch(stack, {"film": 1.0}, 0.7)
    line = stack.surface[:, 0, 4]
    solid = [np.max([f.top] + ([-f.floor] if f.floor is not None else []), axis=0) for f in stack.films]
    creased = np.min(solid, axis=0)[:, 0, 4]
    inside = (grid.z < 0.6) & (grid.z > 0.6 - 3)
    assert np.diff(line)[inside[1:]] == pytest.approx(1.0, abs=0.01)
    assert np.abs(np.diff(creased)[inside[1:]] - 1.0).max() > 0.5


def test_a_front_runs_as_far_as_it_has_time_for():
    """Trap 4. Fifty cells along a film, with a band of four round each surface: the edge stops where it is due."""
    grid = stacks.even_grid(66, -3, 10)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("sac"), 2.0)
    stack = coat(stack, stacks.blank("lid"), 1.0)
    stack = stacks.printed(stack, 6.3 - grid.x)
    stack = stacks.stripped(stacks.beam_etch(stack, {"lid": 1.0, "sac": 1.0}, 3.2))
    after = stacks.wet_etch(stack, {"sac": 1.0}, 50.0)
    gone = stacks.film_of(after, "sac").gone
    edge = stacks.crossings(stacks.value_at(gone, grid, grid.x, np.full(grid.nx, 1.2)), grid.x)
    assert edge[-1] == pytest.approx(56.3, abs=0.1)


def test_a_redistanced_band_reaches_as_far_as_it_is_asked_to():
    """Trap 4, in the kernel: a field that is right beside its crossing alone is right through a band of nine."""
    z = np.arange(30.0)
    field = np.clip(z - 12.4, -0.7, 0.7)[:, None, None].astype(np.float32) * np.ones((1, 3, 3), np.float32)
    assert redistance(field, 1.0, 1.0, z, 9.0)[5:20, 1, 1] == pytest.approx(z[5:20] - 12.4, abs=0.1)
