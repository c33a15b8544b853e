"""The polygon kernel beside its naive twin, on random and awkward input."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels.polygon import BLOCK, signed_distance


def naive_distance(segments: np.ndarray, x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Every sample against every edge; the sign by the angle that the edges sweep about the sample."""
    points = np.stack(np.meshgrid(x, y), axis=-1).reshape(-1, 1, 2)
    start, run = segments[:, :2], segments[:, 2:] - segments[:, :2]
    length = (run**2).sum(axis=1)
    share = np.clip(((points - start) * run).sum(axis=2) / np.where(length > 0, length, 1), 0, 1)
    distance = np.linalg.norm(points - start - share[:, :, None] * run, axis=2).min(axis=1)
    a, b = segments[:, :2] - points, segments[:, 2:] - points
    swept = np.arctan2(a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], (a * b).sum(axis=2)).sum(axis=1)
    return np.where(np.abs(swept) > np.pi, -distance, distance).reshape(len(y), len(x))


def loop_edges(points: np.ndarray) -> np.ndarray:
    return np.hstack([points, np.roll(points, -1, axis=0)])


def star(rng: np.random.Generator, corners: int, size: float) -> np.ndarray:
    """A polygon that is star-shaped about a random centre."""
    angle = np.sort(rng.uniform(0, 2 * np.pi, corners))
    radius = rng.uniform(0.2, 1.0, corners) * size
    return rng.uniform(0, 10, 2) + np.column_stack([radius * np.cos(angle), radius * np.sin(angle)])


@pytest.mark.parametrize("seed", range(6))
def test_random_polygons(seed: int) -> None:
    rng = np.random.default_rng(seed)
    segments = loop_edges(star(rng, int(rng.integers(3, 12)), 6.0))
    x, y = np.sort(rng.uniform(-5, 15, 13)), np.sort(rng.uniform(-5, 15, 11))
    assert np.allclose(signed_distance(segments, x, y), naive_distance(segments, x, y), atol=2e-6)


def test_more_than_one_block() -> None:
    rng = np.random.default_rng(7)
    segments = np.concatenate([loop_edges(star(rng, 9, 3.0)), loop_edges(star(rng, 9, 3.0) + 20)])
    x, y = np.linspace(-5, 35, BLOCK + 3), np.linspace(-5, 35, 5)
    assert np.allclose(signed_distance(segments, x, y), naive_distance(segments, x, y), atol=4e-6)


def test_samples_on_corners_edges_and_their_rows() -> None:
    """A diamond whose corners and edges lie on samples: zero there, right signs in the corners' rows."""
    segments = loop_edges(np.array([[0.0, -2.0], [2.0, 0.0], [0.0, 2.0], [-2.0, 0.0]]))
    places = np.arange(-4.0, 5.0)
    found = signed_distance(segments, places, places)
    taxi = np.abs(places)[None, :] + np.abs(places)[:, None]
    assert np.all(found[taxi == 2] == 0)
    assert np.all(found[taxi > 2] > 0) and np.all(found[taxi < 2] < 0)


def test_edges_without_length_and_a_single_sample() -> None:
    segments = np.concatenate([loop_edges(np.array([[0.0, 0.0], [4.0, 0.0], [4.0, 4.0], [0.0, 4.0]])), [[1, 1, 1, 1]]])
    assert signed_distance(segments, np.array([2.0]), np.array([1.5]))[0, 0] == pytest.approx(-np.hypot(1, 0.5))


def test_a_hole_and_an_island_in_it() -> None:
    def ring(half: float, way: int) -> np.ndarray:
        return loop_edges(half * np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]])[::way])

    segments = np.concatenate([ring(8, 1), ring(5, -1), ring(2, 1)])
    found = signed_distance(segments, np.array([0.5, 3.5, 6.5, 9.5]), np.array([0.1]))
    assert found[0] == pytest.approx([-1.5, 1.5, -1.5, 1.5])
