"""Redistancing against exact distances and plain twins; under 32 cells a side, so that it runs uncompiled too."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels.redistance import extend_distance, redistance
from tests import naive


def ball(n, radius, side=20.0):
    """Exact distance to a sphere off the centre of a cube of `n` samples, cell and centres."""
    x = (np.arange(n) + 0.5) * side / n - 0.48 * side
    return (np.sqrt(x[:, None, None] ** 2 + x[:, None] ** 2 + x**2) - radius).astype(np.float32), side / n, x


def spoiled(exact, reach):
    """The same with everything farther than `reach` from the surface squared up, the sign kept."""
    return np.where(np.abs(exact) < reach, exact, np.sign(exact) * (np.abs(exact) ** 2 + 1)).astype(np.float32)


def rough(shape, seed):
    """A field of random signs and sizes, a quarter of it negative."""
    rng = np.random.default_rng(seed)
    return (rng.random(shape) - 0.25).astype(np.float32)


SHAPES = [(7, 6, 5), (9, 1, 8), (1, 7, 9), (1, 1, 12), (12, 1, 1), (1, 1, 1)]


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("seed", [1, 2])
def test_samples_beside_a_crossing_keep_their_bytes_and_all_keep_their_sign(shape, seed):
    field = rough(shape, seed)
    new = redistance(field, 1.0, 1.0, np.arange(shape[0], dtype=float), 3.0)
    beside = naive.straddling(field)
    assert new.dtype == np.float32
    assert new[beside].tobytes() == field[beside].tobytes()
    assert np.array_equal(new < 0, field < 0)


@pytest.mark.parametrize("zero", [0.0, -0.0])
def test_a_zero_counts_as_outside_and_keeps_its_bytes(zero):
    field = np.array([-1.0, zero, 7.0, 7.0], np.float32)[None, None]
    new = redistance(field, 1.0, 1.0, np.zeros(1), 5.0)
    assert new[..., :2].tobytes() == field[..., :2].tobytes()
    assert np.allclose(new[0, 0, 2:], [1.0, 2.0], atol=1e-5)


@pytest.mark.parametrize("radius", [4.0, 7.0])
def test_a_ball_comes_back(radius):
    """The exact distance within the band, both sides: to 0.02 cell on average, and half the cell, half the error."""
    mean = []
    for n in (15, 30):
        exact, cell, x = ball(n, radius)
        new = redistance(spoiled(exact, 1.8 * cell), cell, cell, x, 3.5)
        within = np.abs(exact) < 3.0
        mean.append(np.abs(new - exact)[within].mean())
        assert np.max(np.abs(new - exact)[within]) < 0.15 * cell
    assert mean[1] < 0.02 * 20 / 30
    assert mean[0] > 2 * mean[1]


def test_a_circle_converges_threefold():
    """Radius 4 in a square of 20: the mean error within the band of 3 falls threefold from 60 to 120 samples a side."""
    mean = []
    for n in (60, 120):
        x = (np.arange(n) + 0.5) * 20 / n - 9.6
        exact = (np.hypot(x[:, None], x) - 4.0).astype(np.float32)[None]
        new = redistance(spoiled(exact, 36 / n), 20 / n, 20 / n, np.zeros(1), 3.5)
        mean.append(np.abs(new - exact)[(exact > -2) & (exact < 3)].mean())
    assert mean[0] > 3 * mean[1]


def test_the_gradient_is_one_within_one_percent():
    """Three cells to either side of a sphere of 8 cells' radius: |gradient| within 0.01, on average, of the exact
    field's by the same central differences (which read up to 0.01 low there on a curved field)."""
    exact, cell, x = ball(30, 16 / 3)
    new = redistance(spoiled(exact, 1.8 * cell), cell, cell, x, 6 * cell)
    slope = np.sqrt(sum(g**2 for g in np.gradient(new, cell)))
    smooth = (np.abs(exact) < 3 * cell)[1:-1, 1:-1, 1:-1]
    true = np.sqrt(sum(g**2 for g in np.gradient(exact, cell)))[1:-1, 1:-1, 1:-1]
    assert np.mean(np.abs(slope[1:-1, 1:-1, 1:-1] - true)[smooth]) < 0.01


def test_a_plane_through_graded_planes_is_exact():
    z = np.concatenate([[0.0], np.cumsum(1.3 ** np.minimum(np.arange(13), 12 - np.arange(13)).clip(max=4))])
    exact = np.broadcast_to((z - z[6] - 0.3)[:, None, None], (14, 3, 2)).astype(np.float32)
    new = redistance(spoiled(exact, 3.5), 1.0, 1.0, z, 8.0)
    within = np.abs(exact) < 8.0
    assert np.max(np.abs(new - exact)[within]) < 1e-3
    assert np.all(np.abs(new[~within]) >= 8.0)


def test_beyond_the_band_the_larger_of_the_old_value_and_the_band_stands():
    field = np.array([-9.0, -0.1, -0.5, 0.5, 0.2, 0.3, 0.1, 9.0], np.float32)[None, None]
    new = redistance(field, 1.0, 1.0, np.zeros(1), 2.0)[0, 0]
    expected = [-9.0, -1.5, -0.5, 0.5, 1.5, 2.0, 2.0, 9.0]
    assert np.allclose(new, expected, atol=1e-5)


def test_a_field_of_one_sign_has_no_distance_but_the_band():
    field = np.full((3, 4, 5), 0.5, np.float32)
    assert np.all(redistance(field, 1.0, 1.0, np.arange(3.0), 2.0) == 2.0)
    assert np.all(redistance(-field, 1.0, 1.0, np.arange(3.0), 2.0) == -2.0)


@pytest.mark.parametrize("turn", [lambda a: a[:, :, ::-1], lambda a: a[:, ::-1], lambda a: np.rot90(a, axes=(1, 2))])
def test_mirrors_and_quarter_turns_commute(turn):
    exact, cell, x = ball(20, 5.0)
    field = spoiled(exact, 1.8 * cell)
    here = turn(redistance(field, cell, cell, x, 4.0))
    there = redistance(np.ascontiguousarray(turn(field)), cell, cell, x, 4.0)
    assert np.allclose(here, there, atol=1e-4)


def test_the_other_side_is_the_negative():
    exact, cell, x = ball(20, 5.0)
    field = spoiled(exact, 1.8 * cell)
    assert np.array_equal(redistance(field, cell, cell, x, 4.0), -redistance(-field, cell, cell, x, 4.0))


def test_distances_agree_with_all_pairs():
    """Onward from the samples within 2 cells of random points: the nearest of all points, to 0.06 cell on average
    and to 0.45 where fronts meet."""
    rng = np.random.default_rng(7)
    shape = (12, 11, 13)
    at = np.stack(np.meshgrid(*(np.arange(n) for n in shape), indexing="ij"), axis=-1).reshape(-1, 3)
    exact = naive.distance_to_points(rng.random((6, 3)) * shape, at).reshape(shape).astype(np.float32)
    near = np.where(exact < 2.5, exact, np.inf).astype(np.float32)
    new = extend_distance(near, np.ones(shape, bool), 1.0, 1.0, np.arange(12.0), np.inf)
    assert np.max(np.abs(new - exact)) < 0.45
    assert np.mean(np.abs(new - exact)) < 0.06


def test_distance_is_through_open_space_only():
    """A wall between two chambers with one opening: sealed space gets nothing, and the way goes round."""
    open_space = np.ones((1, 9, 16), bool)
    open_space[0, :, 6] = False
    open_space[0, 8, 6] = True
    open_space[0, :, 12] = False
    near = np.full((1, 9, 16), np.inf, np.float32)
    near[0, :, 0] = 0.5
    near[0, 4, 6] = near[0, 4, 14] = 0.0
    open_space[0, 4, 14] = False
    new = extend_distance(near, open_space, 1.0, 1.0, np.zeros(1), 50.0)[0]
    assert np.allclose(new[:, :6], np.arange(6) + 0.5, atol=1e-4)
    assert np.all(np.isinf(new[:, 12:]))
    assert new[8, 7] == pytest.approx(7.5, abs=0.1)
    assert new[0, 7] > 14.0


def test_nothing_is_given_above_the_limit_or_from_nothing():
    near = np.full((2, 3, 9), np.inf, np.float32)
    everywhere = np.ones(near.shape, bool)
    assert np.all(np.isinf(extend_distance(near, everywhere, 1.0, 1.0, np.arange(2.0), 4.0)))
    near[..., 0] = 0.0
    new = extend_distance(near, everywhere, 1.0, 1.0, np.arange(2.0), 4.0)
    assert np.allclose(new[..., :5], np.arange(5), atol=1e-5)
    assert np.all(np.isinf(new[..., 5:]))
