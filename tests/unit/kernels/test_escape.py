"""What a moved body runs into, beside scipy's interpolation and plain loops; small grids, for runs uncompiled too."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from scipy.interpolate import RegularGridInterpolator
from scipy.spatial.transform import Rotation

from flowemu.kernels import escape
from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from tests import naive_regions as naive

CELL = 1.0


def interpolated(field: np.ndarray, z: np.ndarray, points: np.ndarray) -> np.ndarray:
    """A field at points (x, y, z), trilinear, constant beyond the outermost columns."""
    _, ny, nx = field.shape
    at = RegularGridInterpolator((z, np.arange(ny), np.arange(nx)), field.astype(float))
    x, y = np.clip(points[:, 0], 0, nx - 1), np.clip(points[:, 1], 0, ny - 1)
    return at(np.stack([points[:, 2], y, x], axis=1))


def depth_in(film: Film, z: np.ndarray, points: np.ndarray) -> np.ndarray:
    """How deep points lie in a film: the least distance to its three bounds, all by interpolation."""
    depth = -interpolated(film.top, z, points)
    if film.floor is not None:
        depth = np.minimum(depth, interpolated(film.floor, z, points))
    if film.gone is not None:
        depth = np.minimum(depth, -interpolated(film.gone, z, points))
    return depth


def everywhere(shape: tuple[int, int, int]) -> np.ndarray:
    nz, ny, nx = shape
    return np.array([-1, nx, -1, ny, -1, nz], np.int64)


def point_inside(
    stack: FilmStack, k: int, points: np.ndarray, begin: int = 0, allowed: float = 0.1, shared: bool = False,
    pieces: np.ndarray | None = None, offset: tuple[float, float, float] = (0.0, 0.0, 0.0), turn: float = 0.0,
    centre: tuple[float, float] = (0.0, 0.0),
) -> int:  # fmt: skip
    t, z, film = stack.topology, stack.grid.z, stack.films[k]
    floor = film.top if film.floor is None else film.floor
    gone = film.top if film.gone is None else film.gone
    own = np.empty(0, np.int64) if pieces is None else pieces
    return int(
        escape.point_inside(
            points, np.array(offset), np.cos(turn), np.sin(turn), np.array(centre), begin, allowed, film.top, floor,
            gone, film.floor is not None, film.gone is not None, k, everywhere(t.code.shape), shared, t.code, t.piece,
            own, 0.0, 0.0, CELL, z,
        )
    )  # fmt: skip


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("allowed", [0.0, 0.1])
def test_the_first_point_inside_is_that_of_interpolated_fields(seed: int, allowed: float) -> None:
    """From any point on, round to the first again, as by depths from scipy's interpolation."""
    stack = naive.random_stack(seed)
    z = stack.grid.z
    points = np.random.default_rng(seed).uniform([-0.5, -0.5, z[0] + 0.01], [5.5, 5.5, z[-1] - 0.01], (80, 3))
    for k, film in enumerate(stack.films):
        inside = depth_in(film, z, points) > allowed
        for begin in (0, 17, 79):
            order = np.roll(np.arange(80), -begin)
            expected = next((int(p) for p in order if inside[p]), -1)
            assert point_inside(stack, k, points, begin, allowed) == expected
        assert point_inside(stack, k, points[~inside], 0, allowed) == -1


def test_points_are_turned_about_the_centre_and_then_moved() -> None:
    """As with points that were turned and moved before, by scipy's rotation."""
    stack = naive.random_stack(1)
    z, turn, centre, offset = stack.grid.z, 0.7, (2.0, 2.5), (0.4, -0.3, 0.2)
    points = np.random.default_rng(1).uniform([0.5, 0.5, z[0] + 0.3], [4.0, 4.0, z[-1] - 0.3], (60, 3))
    middle = np.array([*centre, 0.0])
    moved = Rotation.from_euler("z", turn).apply(points - middle) + middle + offset
    for k in range(len(stack.films)):
        for begin in (0, 30):
            found = point_inside(stack, k, points, begin, offset=offset, turn=turn, centre=centre)
            assert found == point_inside(stack, k, moved, begin)


def test_below_the_grid_is_wafer_and_above_it_nothing() -> None:
    stack = naive.random_stack(0)
    z = stack.grid.z
    below, above = (np.array([[2.0, 2.0, height]]) for height in (z[0] - 3.0, z[-1] + 3.0))
    assert [point_inside(stack, k, below) for k in (0, 1)] == [0, -1]
    assert [point_inside(stack, k, above) for k in (0, 1)] == [-1, -1]


def test_a_shared_film_counts_only_beside_another_piece() -> None:
    """The same place in a film: in a piece of the body itself it does not count, in another piece it does."""
    stack = naive.random_stack(0)
    t = stack.topology
    own = np.unique(t.piece[np.flatnonzero(t.code.reshape(-1) == 0)]).astype(np.int64)
    points = np.array([[2.2, 2.3, stack.grid.z[0] + 0.2]])
    assert point_inside(stack, 0, points, shared=True, pieces=own) == -1
    assert point_inside(stack, 0, points, shared=True) == 0
    assert point_inside(stack, 0, points, pieces=own) == 0


@pytest.mark.parametrize("seed", range(4))
def test_boxes_hold_every_sample_and_interval_of_their_films(seed: int) -> None:
    """Least and greatest sample numbers of each film, one to spare on every side."""
    stack = naive.random_stack(seed)
    t = stack.topology
    places: dict[int, list[tuple[int, ...]]] = {}
    for place in np.ndindex(t.code.shape):
        places.setdefault(int(t.code[place]), []).append(place[::-1])
    inner = t.inner
    for row, d, code in zip(inner.row, inner.direction, inner.code, strict=True):
        for end in (t.samples[row], t.samples[row] + t.strides[d]):
            places.setdefault(int(code), []).append(tuple(int(i) for i in np.unravel_index(end, t.code.shape))[::-1])
    found = escape.film_boxes(t.samples, t.code, t.count, t.start, t.interval_code, t.strides, len(stack.films))
    for k in range(len(stack.films)):
        at = np.array(places[k])
        assert found[k, ::2].tolist() == (at.min(axis=0) - 1).tolist()
        assert found[k, 1::2].tolist() == (at.max(axis=0) + 1).tolist()


@pytest.mark.parametrize("seed", range(4))
def test_points_where_pieces_end_are_the_changes_along_axis_edges(seed: int) -> None:
    """For the pieces of each film: the points on edges at which the twin's intervals enter or leave that film."""
    stack = naive.random_stack(seed, n=5, cut_all=False)
    t, z = stack.topology, stack.grid.z
    bounds = list(zip(t.fields.top, t.fields.floor, t.fields.gone, strict=True))
    for k in range(len(stack.films)):
        nodes = np.concatenate([np.flatnonzero(t.code.reshape(-1) == k), t.inner.node[t.inner.code == k]])
        pieces = np.unique(t.piece[nodes]).astype(np.int64)
        found = escape.leaving_points(
            t.samples, t.code.reshape(-1), t.strides, t.code.shape, t.count, t.start, t.interval_code, t.interval_end,
            t.piece, pieces, z, CELL, CELL,
        )  # fmt: skip
        expected = []
        for place in np.ndindex(t.code.shape):
            for d, step in enumerate(((0, 0, 1), (0, 1, 0), (1, 0, 0))):
                other = tuple(p + s for p, s in zip(place, step, strict=True))
                if any(o >= n for o, n in zip(other, t.code.shape, strict=True)) or t.code[place] == t.code[other]:
                    continue
                a, b = ([float(f[at]) for f in t.fields.arrays] for at in (place, other))
                runs = naive.intervals(a, b, bounds)
                for (before, end), (after, _) in pairwise(runs):
                    if (before == k) != (after == k):
                        point = [float(place[2]), float(place[1]), float(z[place[0]])]
                        point[d] += end
                        expected.append(point)
        assert len(found) == len(expected) > 4
        order = [np.lexsort(np.round(np.array(p), 3).T) for p in (found, expected)]
        assert found[order[0]] == pytest.approx(np.array(expected)[order[1]], abs=2e-3)
