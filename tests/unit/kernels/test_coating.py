"""Small passes over a surface beside numpy and plain loops; small grids, so that it runs uncompiled too."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import ndimage

from flowemu.kernels import coating

SHAPE = (7, 6, 8)
Z = np.cumsum([0.5, 1.0, 1.1, 1.2, 1.0, 0.9, 1.0])


def smooth(seed: int, shape: tuple[int, int, int] = SHAPE) -> np.ndarray:
    noise = ndimage.gaussian_filter(np.random.default_rng(seed).normal(size=shape), 1.0)
    return (3 * noise / noise.std()).astype(np.float32)


def places(shape: tuple[int, int, int]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    z, y, x = np.meshgrid(Z, np.arange(shape[1]), np.arange(shape[2]), indexing="ij")
    return z, y, x


@pytest.mark.parametrize("coverage", [0.3, 0.7, 1.0])
def test_the_extent_is_the_ellipsoids_along_the_slope(coverage: float) -> None:
    """sqrt(c^2 sin^2 + cos^2) for a plane whose normal leans; exact for a linear field."""
    z, y, x = places(SHAPE)
    for a, b in ((0.0, 0.0), (0.6, 0.0), (0.3, -0.5), (5.0, 1.0)):
        field = (z + a * x + b * y - 3.0).astype(np.float32)
        lean = np.arctan(np.hypot(a, b))
        expected = np.hypot(coverage * np.sin(lean), np.cos(lean))
        assert coating.extent(field, Z, 1.0, 1.0, coverage) == pytest.approx(expected, rel=1e-4)


@pytest.mark.parametrize("size", [0.4, 1.0, 2.5])
def test_slopes_of_linear_fields_are_theirs(size: float) -> None:
    z, y, x = places(SHAPE)
    field = (size * (0.48 * x - 0.6 * y + 0.64 * z)).astype(np.float32)
    assert coating.slope_sizes(field, np.ones(SHAPE, bool), Z, 1.0, 1.0) == pytest.approx(size, rel=1e-4)


def slope_along(f: float, low: float | None, high: float | None, a: float, b: float) -> float:
    """The twin of one axis: spacings a, b; None for a neighbour that does not count."""
    if low is not None and high is not None:
        left, right = (f - low) / a, (high - f) / b
        if abs(left - right) < 0.5 * max(abs(left), abs(right)):
            return (left * b + right * a) / (a + b)
        return 0.0 if min(low, high) >= f else (left if low < high else right)
    if high is not None:
        return (high - f) / b
    return 0.0 if low is None else (f - low) / a


@pytest.mark.parametrize("seed", range(2))
def test_slopes_agree_with_the_twin_where_fronts_meet_and_samples_are_left_out(seed: int) -> None:
    field = smooth(seed)
    counts = np.random.default_rng(seed).random(SHAPE) > 0.2
    found = coating.slope_sizes(field, counts, Z, 1.0, 1.0)
    for place in np.ndindex(SHAPE):
        slopes = []
        for axis in range(3):
            sides: list[float | None] = []
            gaps = []
            for way in (-1, 1):
                other = tuple(p + way * (e == axis) for e, p in enumerate(place))
                there = 0 <= other[axis] < SHAPE[axis]
                sides.append(float(field[other]) if there and counts[other] else None)
                gaps.append(abs(Z[other[0]] - Z[place[0]]) if there and axis == 0 else 1.0)
            slopes.append(slope_along(float(field[place]), sides[0], sides[1], gaps[0], gaps[1]))
        size = float(np.linalg.norm(slopes))
        assert found[place] == pytest.approx(size if size > 0.1 else 1.0, rel=1e-4)


def test_scaling_divides_by_the_mean_size_of_the_two_sides_at_a_zero() -> None:
    field, size = smooth(4), np.random.default_rng(4).uniform(0.5, 2, SHAPE).astype(np.float32)
    found = coating.scaled_down(field, size)
    for place in np.ndindex(SHAPE):
        sizes = [size[place]]
        for axis in range(3):
            for way in (-1, 1):
                other = tuple(p + way * (e == axis) for e, p in enumerate(place))
                if 0 <= other[axis] < SHAPE[axis] and (field[other] < 0) != (field[place] < 0):
                    sizes.append(size[other])
        assert found[place] == pytest.approx(field[place] / np.mean(sizes), rel=1e-5)
    assert np.array_equal(found < 0, field < 0)


@pytest.mark.parametrize("seed", range(3))
def test_heights_are_the_topmost_crossings(seed: int) -> None:
    field = smooth(seed)
    found = coating.heights(field, Z)
    for y, x in np.ndindex(SHAPE[1:]):
        column = field[:, y, x]
        solid = np.flatnonzero(column < 0)
        if len(solid) == 0:
            expected = Z[0]
        elif solid[-1] == SHAPE[0] - 1:
            expected = Z[-1]
        else:
            k = solid[-1]
            expected = np.interp(0.0, [column[k], column[k + 1]], [Z[k], Z[k + 1]])
        assert found[y, x] == pytest.approx(expected, abs=1e-5)


def test_a_film_is_kept_out_of_sealed_voids_and_ends_at_their_walls() -> None:
    """Positive in them, as far as the surface is there; next to nothing at the samples about; minus the band else."""
    sealed = np.zeros(SHAPE, bool)
    sealed[2:4, 2:4, 3:5] = True
    surface = np.abs(smooth(6))
    found = coating.kept_out(sealed, surface, np.float32(5.0))
    about = ndimage.binary_dilation(sealed, np.ones((3, 3, 3))) & ~sealed
    assert found[sealed] == pytest.approx(np.maximum(surface[sealed], 1e-4))
    assert found[about] == pytest.approx(1e-4)
    assert (found[~sealed & ~about] == -5.0).all()


def corners_of(face: np.ndarray, gone: np.ndarray) -> list[tuple[list[tuple[int, ...]], np.ndarray]]:
    """Triangles of the grid's faces, cut along their diagonals, in which both fields are zero; with the weights."""
    found = []
    for plane in ((0, 1), (0, 2), (1, 2)):
        one, two = (tuple(int(e == axis) for e in range(3)) for axis in plane)
        for place in np.ndindex(face.shape):
            a = tuple(p + s for p, s in zip(place, one, strict=True))
            b = tuple(p + s for p, s in zip(place, two, strict=True))
            c = tuple(p + s for p, s in zip(a, two, strict=True))
            if any(i >= n for i, n in zip(c, face.shape, strict=True)):
                continue
            for middle in (a, b):
                triangle = [place, middle, c]
                matrix = np.array([[float(f[at]) for at in triangle] for f in (face, gone)] + [[1.0] * 3])
                if abs(np.linalg.det(matrix)) > 1e-6:
                    weights = np.linalg.solve(matrix, [0.0, 0.0, 1.0])
                    if weights.min() >= 0:
                        found.append((triangle, weights))
    return found


@pytest.mark.parametrize("seed", range(3))
def test_corners_of_films_come_to_lie_under_a_coat(seed: int) -> None:
    """Where face and cut meet in a triangle the coat's top is at most minus `least`; only open samples are lowered."""
    rng = np.random.default_rng(seed)
    z, y, x = places(SHAPE)
    face = (z - 3.1 + 0.1 * rng.normal() * x).astype(np.float32)
    gone = (np.cos(rng.uniform(0, 6)) * (x - 3.6) + 0.4 * (y - 2.6)).astype(np.float32)
    top = (np.maximum(face, gone) - 0.1).astype(np.float32)
    opened = top > -0.1
    before, least = top, 0.05
    top = coating.cover_corners(before, face, gone, opened, np.float32(least))
    assert (top <= before).all()
    assert np.array_equal(top[~opened], before[~opened])
    corners = corners_of(face, gone)
    assert len(corners) > 4
    for triangle, weights in corners:
        if any(opened[at] and w > 0.05 for at, w in zip(triangle, weights, strict=True)):
            assert sum(w * top[at] for at, w in zip(triangle, weights, strict=True)) <= -least + 1e-4
