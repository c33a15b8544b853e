"""Arrival times against a plain twin, closed forms and awkward input.

Grids stay under 32 cells a side, so that these run without the compiler too.
"""

from __future__ import annotations

import numpy as np
import pytest
import skfmm
from scipy import ndimage

from flowemu.kernels.march import arrival_on_graph, arrival_on_grid
from tests import naive


def places(shape, dx, dy, z):
    """Centres of a grid's samples, `(n, 3)` x, y, z."""
    z, y, x = np.meshgrid(z, dy * np.arange(shape[1]), dx * np.arange(shape[2]), indexing="ij")
    return np.stack([x.ravel(), y.ravel(), z.ravel()], axis=1)


def graded(n, ratio=1.3, first=1.0):
    """Centres whose spacing grows by a ratio, then shrinks again."""
    gap = first * ratio ** np.minimum(np.arange(n - 1), np.arange(n - 1)[::-1]).clip(max=4)
    return np.concatenate([[0.0], np.cumsum(gap)])


def from_sphere(n, radius, side):
    """Starts at the samples next to a sphere in a cube of `n` samples, slowness, and the exact distance."""
    x = (np.arange(n) + 0.5) * side / n - 0.47 * side
    r = np.sqrt(x[:, None, None] ** 2 + x[:, None] ** 2 + x**2)
    exact = (r - radius).astype(np.float32)
    beside = naive_straddling(exact) & (exact >= 0)
    return np.where(beside, exact, np.inf), np.where(exact >= 0, 1.0, np.inf), exact, x


def naive_straddling(field):
    """As `naive.straddling`, by whole-array shifts."""
    inside = np.pad(field < 0, 1, "edge")
    core = inside[1:-1, 1:-1, 1:-1]
    shifts = [np.roll(inside, s, a)[1:-1, 1:-1, 1:-1] != core for a in range(3) for s in (1, -1)]
    return np.any(shifts, axis=0)


SHAPES = [(9, 8, 7), (12, 1, 11), (1, 9, 12), (1, 1, 20), (20, 1, 1), (1, 1, 1), (6, 10, 2)]


def random_case(shape, seed):
    """Random obstacles, two films, starts of different times, graded planes."""
    rng = np.random.default_rng(seed)
    slowness = rng.choice([1.0, 20.0, np.inf], size=shape, p=[0.6, 0.2, 0.2])
    start = np.where(rng.random(shape) < 0.05, rng.random(shape) * 5, np.inf)
    start[~np.isfinite(slowness)] = np.inf
    return start, slowness, 1.0, 0.8, graded(shape[0])


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_it_agrees_with_marching_in_strict_order(shape, seed):
    """To 0.005 cell: that nodes of one bucket are handled in any order costs next to nothing."""
    start, slowness, dx, dy, z = random_case(shape, seed)
    ours = arrival_on_grid(start, slowness, dx, dy, z)
    plain = naive.arrival_by_heap(
        start.ravel(), slowness.ravel(), naive.grid_neighbours(shape), places(shape, dx, dy, z)
    ).reshape(shape)
    reached = np.isfinite(plain)
    assert np.array_equal(np.isfinite(ours), reached)
    assert np.max(np.abs(ours[reached] - plain[reached]) / slowness[reached], initial=0) <= 5e-3


@pytest.mark.parametrize("shape", SHAPES)
def test_a_grid_written_as_a_graph_gives_the_same_to_the_bit(shape):
    start, slowness, dx, dy, z = random_case(shape, 4)
    ours = arrival_on_grid(start, slowness, dx, dy, z)
    zi = np.repeat(np.arange(shape[0]), shape[1] * shape[2])
    graph = arrival_on_graph(start.ravel(), slowness.ravel(), naive.grid_neighbours(shape), zi, dx, dy, z)
    assert np.array_equal(ours.ravel(), graph)


def test_a_graph_of_two_sheets_in_the_same_cells_keeps_them_apart():
    """Two rows of nodes in the same cells, joined by nothing: the front stays in its own."""
    row = naive.grid_neighbours((1, 1, 8))
    nbr = np.vstack([row, np.where(row >= 0, row + 8, -1)])
    start = np.full(16, np.inf)
    start[0] = 0.0
    time = arrival_on_graph(start, np.ones(16), nbr, np.zeros(16, int), 1.0, 1.0, np.zeros(1))
    assert np.allclose(time[:8], np.arange(8), atol=1e-5)
    assert np.all(np.isinf(time[8:]))


@pytest.mark.parametrize("ratio", [1.0, 1.1, 1.3])
@pytest.mark.parametrize("down", [False, True])
def test_a_plane_front_through_graded_planes_is_exact(ratio, down):
    """T = slowness x |z - z0|. The uniform stencil would be wrong by 10 to 18 % at a ratio of 1.3."""
    z = graded(14, ratio)
    start = np.full((14, 3, 4), np.inf)
    start[-1 if down else 0] = 0.0
    time = arrival_on_grid(start, 2.5, 1.0, 1.0, z)
    expected = 2.5 * np.abs(z - (z[-1] if down else z[0]))
    assert np.max(np.abs(time - expected[:, None, None])) < 1e-4


def test_a_plane_front_askew_through_graded_planes_is_second_order():
    """T = n . r with n = (0.6, 0, 0.8), fixed on two layers of the inflow sides; wrong by under 1e-3 of a cell."""
    z = graded(14, 1.3)
    exact = np.broadcast_to(0.8 * z[:, None, None] + 0.6 * np.arange(16), (14, 1, 16)).copy()
    inflow = np.zeros(exact.shape, bool)
    inflow[:2] = inflow[..., :2] = True
    time = arrival_on_grid(np.where(inflow, exact, np.inf), np.where(inflow, np.inf, 1.0), 1.0, 1.0, z)
    assert np.max(np.abs(time - exact)) < 1e-3


def test_a_sphere_converges_at_second_order_but_for_its_start():
    """Distance from a sphere of radius 2 in a cube of 10; halving the cell cuts the mean error 2.5-fold or more.

    The first layer knows no node behind it and is first order there, so the error is second order with a
    constant that grows slowly: threefold and more from 12 to 24 samples a side, not four.
    """
    mean = []
    for n in (14, 28):
        start, slowness, exact, x = from_sphere(n, 2.0, 10.0)
        time = arrival_on_grid(start, slowness, 10.0 / n, 10.0 / n, x)
        mean.append(np.abs(time - exact)[exact >= 0].mean())
    assert mean[1] < 0.02 * 10 / 28 * 2
    assert mean[0] / mean[1] > 2.5


def test_arrival_round_an_obstacle():
    """In the shadow of a plate's edge T = |source - edge| + |edge - r|, to 0.1 cell on average and 0.25 at most.

    The edge is the last open sample of the plate's column, since fronts go from centre to centre.
    """
    y, x = np.meshgrid(np.arange(30), np.arange(30), indexing="ij")
    slowness = np.where((x == 12) & (y < 15), np.inf, 1.0)[None]
    sight = np.hypot(x - 3.0, y - 6.0)
    time = arrival_on_grid(np.where(sight < 2.5, sight, np.inf)[None], slowness, 1.0, 1.0, np.zeros(1))[0]
    bent = np.hypot(12 - 3.0, 15 - 6.0) + np.hypot(x - 12, y - 15)
    shadow = (x > 12) & (y - 6 < x - 3)
    assert np.max(np.abs(time - bent)[shadow]) < 0.25
    assert np.mean(np.abs(time - bent)[shadow]) < 0.1
    assert np.max(np.abs(time - sight)[x < 12]) < 0.25


def test_the_cell_behind_an_edge_is_reached_straight():
    """From (0, 0) past a blocked cell at (1, 0) to (1, 1) and back to (2, 0): T = sqrt(2) at both."""
    start = np.full((1, 2, 3), np.inf)
    start[0, 0, 0] = 0.0
    start[0, 0, 1] = np.nan
    time = arrival_on_grid(start, 1.0, 1.0, 1.0, np.zeros(1))[0]
    assert time[1] == pytest.approx([1.0, np.sqrt(2), np.sqrt(2) + 1], abs=0.2)
    assert time[1, 1] == pytest.approx(np.sqrt(2), abs=1e-5)


def test_a_front_takes_the_slowness_of_the_node_that_it_reaches():
    """Along a row through fast, slow and fast film: T grows by cell x the receiving slowness at every step."""
    slowness = np.repeat([1.0, 30.0, 1.0], 8)
    start = np.full((1, 1, 24), np.inf)
    start[0, 0, 0] = 0.0
    time = arrival_on_grid(start, slowness[None, None], 0.5, 0.5, np.zeros(1))[0, 0]
    assert np.allclose(time, np.concatenate([[0.0], np.cumsum(0.5 * slowness[1:])]), rtol=1e-5)


def test_a_corridor_of_one_cell_is_followed_round_its_bends():
    """T is exact along the first leg, then at most 4 % longer than the taut string.

    Walls lie in every second row of 15 x 15, open at alternate ends. Taut: 13.51 to the first wall's corner and
    from the last one, 1 past each of 7 walls' ends, 13.04 from one to the next: 112.3. By steps along the axes it
    would be 126.
    """
    closed = np.zeros((15, 15), bool)
    closed[1::4, :-1] = closed[3::4, 1:] = True
    start = np.full((15, 15), np.inf)
    start[0, 0] = 0.0
    time = arrival_on_grid(start[None], np.where(closed, np.inf, 1.0)[None], 1.0, 1.0, np.zeros(1))[0]
    taut = 2 * np.hypot(13.5, 0.5) + 7 + 6 * np.hypot(13, 1)
    assert np.allclose(time[0, :14], np.arange(14), atol=1e-4)
    assert taut < time[14, 0] < 1.04 * taut
    assert np.all(np.isinf(time[closed]))


def test_nothing_starts_or_all_is_blocked():
    nothing = np.full((3, 4, 5), np.inf)
    assert np.all(np.isinf(arrival_on_grid(nothing, 1.0, 1.0, 1.0, np.arange(3.0))))
    assert np.all(np.isinf(arrival_on_grid(nothing, np.full((3, 4, 5), np.inf), 1.0, 1.0, np.arange(3.0))))
    assert arrival_on_graph(np.empty(0), np.empty(0), np.empty((0, 6)), np.empty(0), 1.0, 1.0, np.zeros(1)).size == 0


def test_a_nan_start_blocks_and_an_infinite_slowness_fixes_a_start():
    start = np.full((1, 1, 6), np.inf)
    start[0, 0, [0, 1, 4]] = -1.0, 3.0, np.nan
    slowness = np.ones((1, 1, 6))
    slowness[0, 0, [0, 1]] = np.inf
    time = arrival_on_grid(start, slowness, 1.0, 1.0, np.zeros(1))[0, 0]
    assert time[:2].tolist() == [-1.0, 3.0]
    assert np.allclose(time[2:4], [5.0, 6.3333], atol=1e-3)  # feet 3 + (3 + 1) / 3, then 5 + (5 - 3) / 3
    assert np.all(np.isinf(time[4:]))


def test_a_start_is_lowered_but_never_raised():
    start = np.full((1, 1, 9), np.inf)
    start[0, 0, [0, 3, 6]] = 0.0, 9.0, 2.0
    time = arrival_on_grid(start, 1.0, 1.0, 1.0, np.zeros(1))[0, 0]
    assert np.allclose(time, [0, 1, 2, 3, 4, 3, 2, 3, 4], atol=1e-5)


@pytest.mark.parametrize("limit", [0.5, 3.0, 40.0])
def test_a_limit_changes_nothing_below_it(limit):
    start, slowness, dx, dy, z = random_case((9, 8, 7), 5)
    start[:, 3:] = np.inf
    free = arrival_on_grid(start, slowness, dx, dy, z)
    assert np.array_equal(arrival_on_grid(start, slowness, dx, dy, z, limit), np.where(free <= limit, free, np.inf))


def test_starts_far_apart_in_time_and_films_far_apart_in_rate():
    """Beyond the circle of buckets: two corridors that start a million seconds apart, one with a ratio of 10^5."""
    start = np.full((1, 3, 6), np.inf)
    start[0, :, 0] = 0.0, np.nan, 1e6
    slowness = np.ones((1, 3, 6))
    slowness[0, 0, 1:] = 1e5
    slowness[0, 1] = np.inf
    time = arrival_on_grid(start, slowness, 1.0, 1.0, np.zeros(1))[0]
    assert np.allclose(time[0], 1e5 * np.arange(6), rtol=1e-5)
    assert np.allclose(time[2], 1e6 + np.arange(6), rtol=1e-6)


def test_a_slowness_of_zero_is_refused():
    with pytest.raises(ValueError, match="above zero"):
        arrival_on_grid(np.zeros((1, 1, 2)), 0.0, 1.0, 1.0, np.zeros(1))


def test_stretched_spacing_is_a_stretched_metric():
    """From a ball of 2.5 in spacings 2, 1.5 and 1: T = |r|, to 0.3 on average."""
    at = np.arange(9.0) - 4
    exact = np.sqrt(at[:, None, None] ** 2 + (1.5 * at[:, None]) ** 2 + (2 * at) ** 2)
    time = arrival_on_grid(np.where(exact < 2.5, exact, np.inf), 1.0, 2.0, 1.5, at)
    assert np.max(np.abs(time - exact)) < 0.7
    assert np.mean(np.abs(time - exact)) < 0.3


@pytest.mark.parametrize("turn", [lambda a: a[:, :, ::-1], lambda a: a[:, ::-1], lambda a: np.rot90(a, axes=(1, 2))])
def test_mirrors_and_quarter_turns_commute(turn):
    """To rounding, whatever the order within a bucket."""
    start, slowness, _, x = from_sphere(16, 2.0, 10.0)
    here = turn(arrival_on_grid(start, slowness, 1.0, 1.0, x))
    there = arrival_on_grid(turn(start), turn(slowness), 1.0, 1.0, x)
    assert np.allclose(here, there, atol=1e-4)


def solid_of_balls(shape, seed):
    """Exact signed distance (where positive) to a union of random balls, negative inside."""
    rng = np.random.default_rng(seed)
    axes = np.meshgrid(*(np.arange(n) for n in shape), indexing="ij")
    balls = [(rng.random(3) * shape, 2 + 3 * rng.random()) for _ in range(5)]
    apart = [np.sqrt(sum((a - c) ** 2 for a, c in zip(axes, centre, strict=True))) - r for centre, r in balls]
    return np.min(apart, axis=0)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_it_agrees_with_scikit_fmm_and_is_no_less_exact(seed):
    exact = solid_of_balls((26, 24, 28), seed)
    outside = exact >= 0
    start = np.where(naive_straddling(exact) & outside, exact, np.inf)
    ours = arrival_on_grid(start, np.where(outside, 1.0, np.inf), 1.0, 1.0, np.arange(26.0))
    theirs = np.asarray(skfmm.travel_time(exact, np.ones_like(exact), order=2))
    error, their_error = np.abs(ours - exact)[outside], np.abs(theirs - exact)[outside]
    assert error.mean() <= their_error.mean()
    assert error.max() <= their_error.max()
    assert np.abs(ours - theirs)[outside].mean() < 0.1


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_it_agrees_with_the_exact_distance_between_samples(seed):
    """Onward from scipy's exact transform within 2.5 cells of a solid: 0.05 cell on average, 0.3 at most."""
    solid = solid_of_balls((26, 24, 28), seed) < 0
    exact = ndimage.distance_transform_edt(~solid)
    near = exact <= 2.5
    ours = arrival_on_grid(np.where(near, exact, np.inf), np.where(near, np.inf, 1.0), 1.0, 1.0, np.arange(26.0))
    assert np.mean(np.abs(ours - exact)) < 0.05
    assert np.max(np.abs(ours - exact)) < 0.3


@pytest.mark.parametrize("dimensions", [2, 3])
def test_a_point_is_a_fair_source(dimensions):
    """T = |r| from one sample of time 0: to 0.15 cell on average, 0.35 at most, on either side."""
    at = np.arange(25) - 12
    exact = np.sqrt((at**2 if dimensions == 3 else np.zeros(1))[:, None, None] + at[:, None] ** 2 + at**2)
    time = arrival_on_grid(np.where(exact == 0, 0.0, np.inf), 1.0, 1.0, 1.0, np.arange(len(exact), dtype=float))
    assert np.mean(np.abs(time - exact)) < 0.15
    assert np.max(np.abs(time - exact)) < 0.35
