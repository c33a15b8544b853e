"""The kernels of a vertical beam beside their plain twins, on random stacks of films with holes."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import beam, shadow
from flowemu.stack.topology import Topology
from tests import naive_beam as naive

SEEDS = range(4)
SLOWNESS = np.array([np.inf, 2.0, 0.5, 1.0])
LISTED = [[3], [3, 2], [3, 2, 1]]


def edges(t: Topology) -> tuple[np.ndarray, ...]:
    return t.code, t.row_of, t.count, t.start, t.interval_code, t.interval_end, t.grid.z


def columns_of(t: Topology) -> list[tuple[int, int]]:
    return [(y, x) for y in range(t.code.shape[1]) for x in range(t.code.shape[2])]


@pytest.fixture(params=SEEDS)
def stack(request: pytest.FixtureRequest) -> Topology:
    t = naive.random_stack(request.param)[1]
    assert set(np.unique(t.code)) >= {-1, 0, 1, 2, 3}
    assert (t.count > 2).any()
    return t


@pytest.fixture(params=[*SEEDS, "scattered"])
def held_by(request: pytest.FixtureRequest) -> Topology:
    """A random stack, or films strewn over the samples, so that they come again and again in a column."""
    return naive.scattered(5) if request.param == "scattered" else naive.random_stack(request.param)[1]


@pytest.mark.parametrize("budget", [0.0, 0.8, 2.5, 40.0])
def test_a_beam_spends_its_time_from_the_top(held_by: Topology, budget: float) -> None:
    floor, entry, stop, first, met = beam.strike(*edges(held_by), SLOWNESS, budget)
    assert budget > 0 or (floor == entry).all()
    for y, x in columns_of(held_by):
        held = naive.column(held_by, y, x)
        exact = naive.struck(held, SLOWNESS, budget, held_by.grid.z[0])
        assert (stop[y, x], first[y, x]) == exact[2:4]
        assert (floor[y, x], entry[y, x]) == pytest.approx(exact[:2], abs=1e-5)
        np.testing.assert_allclose(met[:, y, x], exact[4], atol=1e-5)


def test_a_beam_that_nothing_stops_ends_at_the_lowest_sample(held_by: Topology) -> None:
    floor, _, stop, _, _ = beam.strike(*edges(held_by), np.full(4, 0.1), 100.0)
    assert (stop == -1).all()
    assert (floor == held_by.grid.z[0]).all()


@pytest.mark.parametrize("listed", LISTED)
def test_times_at_a_films_top_and_bottom_through_what_is_listed_with_it(held_by: Topology, listed: list[int]) -> None:
    slot = np.full(4, -1)
    slot[listed] = np.arange(len(listed))
    out = beam.through_times(*edges(held_by), SLOWNESS, slot, len(listed))
    assert np.isfinite(out[0]).any()
    for y, x in columns_of(held_by):
        held = naive.column(held_by, y, x)
        exact = [naive.through(held, SLOWNESS, k, [q for q in listed if q != k]) for k in listed]
        np.testing.assert_allclose(out[:, :, y, x].T, exact, atol=1e-5)


def test_thicknesses_add_up_the_intervals(held_by: Topology) -> None:
    out = beam.column_thickness(*edges(held_by), 4)
    for y, x in columns_of(held_by):
        held = naive.column(held_by, y, x)
        exact = [sum(high - low for code, low, high, _ in held if code == k) for k in range(4)]
        assert out[:, y, x] == pytest.approx(exact, abs=1e-5)


def test_lengths_and_contacts_of_pieces(stack: Topology) -> None:
    roots = np.unique(stack.piece[np.flatnonzero(stack.code.reshape(-1) >= 0)])
    for pieces in (roots[::2], roots[:1]):
        listed = {int(p) for p in pieces}
        for film in range(4):
            out = beam.piece_length(*edges(stack), film, stack.piece, pieces.astype(np.int64))
            assert out == pytest.approx(naive.lengths(stack, film, listed), abs=1e-4)
        given = stack.samples, stack.code.reshape(-1), stack.strides, stack.code.shape, stack.count, stack.start
        rest = stack.interval_code, stack.piece, pieces.astype(np.int64), stack.grid.z, stack.grid.cell
        exact = naive.contact(stack, listed)
        assert beam.touching_area(*given, *rest, False) == pytest.approx(exact)
        assert beam.touching_area(*given, *rest, True) == pytest.approx(0.5 * exact)


def marks(t: Topology, film: int, low: int) -> np.ndarray:
    nz, ny, nx = t.code.shape
    plane_start = np.searchsorted(t.samples, np.arange(nz + 1) * (ny * nx))
    return shadow.mark_film(t.samples, plane_start, t.code, t.count, t.start, t.interval_code, film, low)


@pytest.mark.parametrize("low", [0, 1, 4])
def test_samples_in_a_film_and_beside_it(stack: Topology, low: int) -> None:
    for film in range(4):
        np.testing.assert_array_equal(marks(stack, film, low), naive.film_marks(stack, film)[low:])


def test_columns_that_the_beam_passed(stack: Topology) -> None:
    mark = marks(stack, 2, 1)
    z = stack.grid.z
    floor = np.random.default_rng(3).uniform(z[0], z[-1], mark.shape[1:])
    exact = ((mark > 0) & (z[1:, None, None] >= floor)).any(axis=0)
    np.testing.assert_array_equal(shadow.passed_columns(mark, floor, z, 1), exact)


@pytest.mark.parametrize(("mask", "film"), [(1, 0), (3, 0), (3, 1), (3, 2), (1, 3)])
@pytest.mark.parametrize("corner", [(0, 0, 0), (2, 1, 3)])
def test_the_shadow_of_a_mask(stack: Topology, mask: int, film: int, corner: tuple[int, int, int]) -> None:
    f, shape = stack.fields, stack.code.shape
    side = np.full([n - c - 1 for n, c in zip(shape, corner, strict=True)], np.inf, np.float32)
    side[:, 0, 0] = -9.0  # what is lower already stays
    top, floor, gone = (f.arrays[n[mask]].reshape(shape) for n in (f.top, f.floor, f.gone))
    given = stack.row_of, stack.count, stack.start, stack.interval_code, stack.interval_end
    shadow.shadow(side, top, floor, gone, True, *given, film, *corner)
    assert np.isfinite(side[:, 1:, 1:]).any()
    for at in np.ndindex(side.shape):
        z, y, x = (int(a) for a in np.add(at, corner))
        exact = -9.0 if at[1:] == (0, 0) else naive.shadow_at(stack, mask, film, z, y, x)
        assert side[at] == pytest.approx(exact, abs=1e-5)


@pytest.mark.parametrize("with_gone", [True, False])
def test_a_top_moved_down_as_seen_from_above(stack: Topology, with_gone: bool) -> None:
    f, shape, z = stack.fields, stack.code.shape, stack.grid.z
    top, gone = f.arrays[f.top[3]].reshape(shape), f.arrays[f.gone[3]].reshape(shape)
    rng = np.random.default_rng(1)
    low, y0, x0 = 1, 2, 1
    mark = (rng.random((6, 3, 4)) < 0.7).astype(np.uint8)
    depth = np.where(rng.random((3, 4)) < 0.3, 0.0, rng.uniform(0, 9, (3, 4)))
    lateral, shielded = rng.normal(size=mark.shape), rng.random((3, 4)) < 0.5
    out = shadow.moved_down(mark, top, gone, with_gone, depth, lateral, shielded, z, low, y0, x0)
    both = np.maximum(top, gone) if with_gone else top
    for k, y, x in np.ndindex(mark.shape):
        moved = 0.0 if shielded[y, x] and lateral[k, y, x] > 0 else depth[y, x]
        exact = naive.lowered(both[:, y + y0, x + x0], z, k + low, moved) if mark[k, y, x] else 0.0
        assert out[k, y, x] == pytest.approx(exact, abs=1e-5)


@pytest.mark.parametrize("angle", [90.0, 80.0])
def test_what_is_removed_is_above_the_floor_and_clear_of_the_walls(angle: float) -> None:
    rng = np.random.default_rng(2)
    shape, z, low, cell, band = (5, 4, 6), np.linspace(0.0, 6.0, 8), 2, 0.7, 2.0
    mark = rng.integers(0, 4, shape).astype(np.uint8)
    side = np.where(rng.random(shape) < 0.3, np.inf, rng.normal(size=shape)).astype(np.float32)
    below = rng.normal(scale=2, size=shape).astype(np.float32)
    floor, entry = rng.uniform(1, 5, shape[1:]), rng.uniform(3, 6, shape[1:])
    open_column, cut = rng.random(shape[1:]) < 0.5, rng.random(shape[1:]) < 0.2
    turn = np.tan(np.radians(angle)), np.sin(np.radians(angle))
    lateral = shadow.wall_distance(mark, side, floor, entry, open_column, angle != 90.0, *turn, z, low, cell)
    shielded = rng.random(shape[1:]) < 0.5
    out = shadow.removed_values(mark, below, lateral, cut, shielded, band)
    exact = np.zeros(shape)
    for k, y, x in np.argwhere(mark > 0):
        reached = z[k + low] >= floor[y, x]
        behind = entry[y, x] - z[k + low]
        exact[k, y, x] = naive.lateral_at(side[k, y, x], reached, open_column[y, x], behind, angle, cell)
    np.testing.assert_allclose(lateral, exact, rtol=1e-6)
    for k, y, x in np.ndindex(shape):
        wall = naive.mean_beside(exact, (mark > 0) & (mark != 2), (k, y, x)) if mark[k, y, x] == 2 else exact[k, y, x]
        down = band if cut[y, x] and not (shielded[y, x] and exact[k, y, x] > 0) else below[k, y, x]
        value = -np.hypot(down, wall) if max(down, wall) < 0 else min(down, wall)
        assert out[k, y, x] == pytest.approx(np.clip(value, -band, band) if mark[k, y, x] else 0.0, abs=1e-5)
