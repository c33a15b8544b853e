"""Starts of fronts: closest points beside another way to find them, and exact times beside all pairs."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import starts
from tests import naive_regions as naive
from tests import stacks
from tests.naive_triangles import distance_to_triangle
from tests.unit.kernels.test_faces import bare


def closest(point: np.ndarray, triangles: np.ndarray, q: int) -> np.ndarray:
    return np.array(starts._closest(*(float(p) for p in point), triangles, q))


@pytest.mark.parametrize("seed", range(3))
def test_the_closest_point_is_in_the_triangle_and_nearest(seed: int) -> None:
    """Distance as by the twin to 1e-9; the point itself is a mean of the corners with weights of zero and more."""
    rng = np.random.default_rng(seed)
    for _ in range(60):
        triangles = rng.normal(size=(3, 3, 3))
        point = 2 * rng.normal(size=3)
        found = closest(point, triangles, 1)
        assert np.linalg.norm(found - point) == pytest.approx(distance_to_triangle(point, triangles[1]), abs=1e-9)
        weights = np.linalg.lstsq(np.vstack([triangles[1].T, np.ones(3)]), np.append(found, 1.0), rcond=None)[0]
        assert weights.min() > -1e-7


@pytest.mark.parametrize(
    "corners",
    [
        [[0, 0, 0], [0, 0, 0], [0, 0, 0]], [[0, 0, 0], [1, 0, 0], [2, 0, 0]], [[0, 0, 0], [1, 0, 0], [1, 0, 0]],
        [[0, 0, 0], [1, 0, 0], [0.5, 1e-9, 0]],
    ],
)  # fmt: skip
def test_triangles_without_area_are_points_and_lines(corners: list[list[float]]) -> None:
    triangle = np.array([corners], float)
    for point in np.random.default_rng(4).normal(size=(20, 3)):
        found = np.linalg.norm(closest(point, triangle, 0) - point)
        assert found == pytest.approx(distance_to_triangle(point, triangle[0]), abs=1e-6)


def test_points_on_corners_edges_and_faces_are_their_own_closest() -> None:
    triangle = np.array([[[0, 0, 0], [2, 0, 0], [0, 2, 0]]], float)
    for point in ([0, 0, 0], [2, 0, 0], [0, 2, 0], [1, 0, 0], [1, 1, 0], [0.5, 0.5, 0]):
        assert closest(np.array(point, float), triangle, 0) == pytest.approx(point)


def test_boxes_are_the_least_and_the_greatest_corners() -> None:
    triangles = np.random.default_rng(2).normal(size=(9, 3, 3))
    first = np.array([0, 4, 5, 9])
    found = starts.boxes(triangles, first)
    for c in range(3):
        mine = triangles[first[c] : first[c + 1]].reshape(-1, 3)
        assert found[c] == pytest.approx([*mine.min(axis=0), *mine.max(axis=0)])


def test_the_reach_is_the_greatest_of_the_cells_about() -> None:
    """A cell's corners look one cell farther, and three where its surface ends, as do samples up to three off."""
    shape = (9, 8, 10)
    cells = np.array([np.ravel_multi_index(at, shape) for at in ((1, 1, 1), (5, 4, 5))])
    found = starts.sample_reach(cells, np.array([0, 1], np.uint8), shape).reshape(shape)
    for place in np.ndindex(shape):
        plain = all(0 <= p - c <= 1 for p, c in zip(place, (1, 1, 1), strict=True))
        ending = all(-3 <= p - c <= 4 for p, c in zip(place, (5, 4, 5), strict=True))
        assert found[place] == (starts.FAR if ending else starts.NEAR if plain else -1)


@pytest.mark.parametrize("seed", range(4))
def test_times_beside_a_face_are_the_distances_to_all_triangles(seed: int) -> None:
    """One film etched at 1 um/s: within a cell of its bare face a sample's time is its distance to it, to 1e-4 s.

    Nowhere is a time less than the distance, but for the march's own error of 0.02 s.
    """
    stack = naive.random_stack(seed)
    k = len(stack.films) - 1
    triangles, _, _, _ = bare(stack, [k])
    sample, time = stacks.front(stack, {stack.films[k].name: 1.0}).of_film(k)
    own = stack.topology.code.reshape(-1)[sample] == k
    z, y, x = np.unravel_index(sample[own], stack.topology.code.shape)
    place = np.stack([x, y, stack.grid.z[z]], axis=1).astype(float)
    assert len(place) > 5
    distance = np.array([min(distance_to_triangle(p, t) for t in triangles) for p in place])
    near = distance < 0.95
    assert time[own][near] == pytest.approx(distance[near], abs=1e-4)
    assert (time[own] > distance - 0.02).all()
