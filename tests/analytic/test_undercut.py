"""Isotropic etches against closed forms. Errors are in cells along the normal."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.steps.models.coating import coat
from tests import stacks

FAN = np.radians(np.linspace(-2, -88, 40))


def undercut(cell: float, depth: float, offset: float, mask: float = 2.0):
    """Glass of 24 um under a mask film that ends at x = 4.3 + offset, etched for a depth.

    Returns the stacks before and after and the mask's edge (x, z).
    """
    grid = stacks.even_grid(round(40 / cell), -2, 32, cell)
    stack = coat(stacks.bare(grid, 0.13), stacks.blank("glass"), 24.0 + offset)
    stack = coat(stack, stacks.blank("mask"), mask)
    edge = 4.3 + offset
    stack = stacks.printed(stack, edge - grid.x, thickness=2.0)
    stack = stacks.stripped(stacks.beam_etch(stack, {"mask": 1.0}, 1.3 * mask))
    return stack, stacks.wet_etch(stack, {"glass": 1.0}, depth), (edge, 24.13 + offset)


def profile_errors(cell: float, depth: float, mask: float = 2.0) -> np.ndarray:
    """Distance of the etched profile from the mask's edge, less the depth, um, `(3, angles)` from the mask down."""
    out = []
    for offset in (0.0, 0.27, 0.61):
        _, after, edge = undercut(cell, depth, offset, mask)
        gone = stacks.film_of(after, "glass").gone
        out.append(stacks.reach(gone, after.grid, (edge[0], edge[1] - 1e-3), FAN, depth + 4) - depth)
    return np.array(out)


@pytest.mark.parametrize("depth", [3.0, 10.0, 20.0])
def test_the_profile_under_a_mask_is_a_quarter_circle(depth):
    """Radius = depth = undercut, over 3 to 20 cells: to 0.1 cell everywhere (seen: 0.088), on either side."""
    assert np.abs(profile_errors(1.0, depth)).max() < 0.1


@pytest.mark.parametrize("mask", [0.1, 0.3, 0.7])
def test_a_mask_thinner_than_a_cell_is_undercut_no_more_than_a_thick_one(mask):
    """Along the mask the undercut is the depth to 0.1 cell, and the profile's mean to 0.1."""
    error = profile_errors(1.0, 8.0, mask)
    assert np.abs(error[:, 0]).max() < 0.1
    assert np.abs(error).mean() < 0.1


@pytest.mark.parametrize("depth", [3.0, 10.0])
def test_the_open_floor_sinks_by_the_depth(depth):
    """Rate x time, to 0.02 cell, from the mask's edge outward too: no trail of it is left."""
    for offset in (0.0, 0.27, 0.61):
        before, after, edge = undercut(1.0, depth, offset)
        for x in np.arange(0.5, edge[0] - 0.2, 0.5):
            sunk = stacks.thickness(before, "glass", x) - stacks.thickness(after, "glass", x)
            assert sunk == pytest.approx(depth, abs=0.02)


def test_halving_the_cell_helps_under_a_mask():
    """Over 20 um the profile's mean error falls at least 1.7-fold, as for a case with a corner.

    Below 10 cells it is under 0.03 cell at either size, as times are exact out to a few cells from the edge.
    """
    coarse, fine = (np.abs(profile_errors(cell, 20.0)).mean() for cell in (1.0, 0.5))
    assert coarse > 1.7 * fine


@pytest.mark.parametrize("upper", [0.05, 0.3, 1.0, 3.0, 20.0])
def test_times_through_films_of_unlike_rates_add(upper):
    """At depth z in the lower film T = t1 / r1 + z / r2, to 0.05 cell of the film it is in, at any rate ratio."""
    for height in (0.0, 0.3, 0.8):
        grid = stacks.even_grid(4, -3, 14)
        stack = coat(stacks.bare(grid, height), stacks.blank("lower"), 4.37)
        stack = coat(stack, stacks.blank("upper"), 5.21)
        arrival = stacks.front(stack, {"lower": 1.0, "upper": upper})
        for k, name in ((1, "lower"), (2, "upper")):
            sample, time = arrival.of_film(k)
            z = grid.z[sample // (2 * grid.nx)]
            rate = {"lower": 1.0, "upper": upper}[name]
            exact = (height + 9.58 - z) / upper if k == 2 else 5.21 / upper + (height + 4.37 - z)
            assert np.abs((time - exact) * rate).max() < 0.05, name
        after = stack.carve(arrival.removed(5.21 / upper + 2.0))
        assert stacks.thickness(after, "lower", 2.0) == pytest.approx(2.37, abs=0.05)


def test_a_front_bends_round_an_obstacle_in_the_film():
    """T = |source - corner| + |corner - r| below a buried bar, out of sight: 0.22 cell on average, 0.4 at most.

    A mask's edge at x = 4.3 opens a glass; the bar lies on its lower film. Seen: 0.21 on average.
    """
    grid = stacks.even_grid(36, -2, 34)
    stack = coat(stacks.bare(grid, 0.13), stacks.blank("glass 1"), 8.0)
    stack = coat(stack, stacks.blank("bar"), 6.0)
    stack = stacks.printed(stack, np.abs(grid.x - 18.0) - 3.2)
    stack = stacks.stripped(stacks.beam_etch(stack, {"bar": 1.0}, 6.6))
    stack = coat(stack, stacks.blank("glass 2"), 6.0)
    stack = coat(stack, stacks.blank("mask"), 2.0)
    stack = stacks.printed(stack, 4.3 - grid.x, thickness=12.0)
    stack = stacks.stripped(stacks.beam_etch(stack, {"mask": 1.0}, 3.0))
    arrival = stacks.front(stack, {"glass 1": 1.0, "glass 2": 1.0})
    source, corner = np.array([4.3, 14.13]), np.array([14.8, 8.13])
    sample, time = arrival.of_film(stack.index("glass 1"))
    z, x = grid.z[sample // (2 * grid.nx)], grid.x[sample % grid.nx]
    along, across = corner - source
    hidden = (x > 15.5) & (x < 26.0) & (z > corner[1] + 1.0 + across / along * (x - corner[0]))
    exact = np.hypot(along, across) + np.hypot(x - corner[0], z - corner[1])
    error = np.abs(time - exact)[hidden]
    assert hidden.sum() > 40
    assert error.mean() < 0.22
    assert error.max() < 0.4


def test_an_etch_stops_at_what_it_does_not_etch_and_at_a_sealed_void():
    """A film under a closed one is never reached, nor one round a sealed void."""
    grid = stacks.even_grid(20, -3, 12)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("sac"), 3.0)
    stack = coat(stack, stacks.blank("lid"), 0.4)
    _, times = stacks.front(stack, {"sac": 1.0}).of_film(1)
    assert len(times) > 0
    assert not np.isfinite(times).any()
    assert stacks.wet_etch(stack, {"sac": 1.0}, 100.0) is stack
