"""Distances in the void and depths in the solid beside brute force; small grids, so that it runs uncompiled too."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import surface
from tests import naive_regions as naive

SHAPE = (9, 8, 10)
Z = np.arange(9) + 0.5


def plane(direction: tuple[float, float, float], offset: float) -> np.ndarray:
    """Signed distance to a plane with this normal (x, y, z) about the grid's middle, negative behind it."""
    normal = np.array(direction) / np.linalg.norm(direction)
    z, y, x = np.meshgrid(Z - 4.5, np.arange(8) - 3.5, np.arange(10) - 4.5, indexing="ij")
    return (normal[0] * x + normal[1] * y + normal[2] * z - offset).astype(np.float32)


def lowered(top: np.ndarray, floor: np.ndarray | None, gone: np.ndarray | None, band: float = 4.0) -> np.ndarray:
    inside = top < 0
    if floor is not None:
        inside &= floor >= 0
    if gone is not None:
        inside &= gone < 0
    code = np.where(inside, 0, -1).astype(np.int16)
    out = np.full(SHAPE, np.float32(band), np.float32)
    surface.lower_to_film(
        out, code, top, top if floor is None else floor, top if gone is None else gone, floor is not None,
        gone is not None, Z, 1.0, 1.0, np.float32(band), 1.0,
    )  # fmt: skip
    return out


def nearest(normals: list[tuple[float, float, float]], offsets: list[float], band: float) -> np.ndarray:
    """Distance of each sample to what lies behind all the planes: feet on each plane and on the edge, the nearest."""
    unit = np.array([np.array(n) / np.linalg.norm(n) for n in normals])
    out = np.full(SHAPE, band)
    for z, y, x in np.ndindex(SHAPE):
        point = np.array([x - 4.5, y - 3.5, Z[z] - 4.5])
        for active in ([], [0], [1], [0, 1]):
            a = unit[active]
            step = a.T @ np.linalg.solve(a @ a.T, a @ point - np.array(offsets)[active]) if active else np.zeros(3)
            if (unit @ (point - step) <= np.array(offsets) + 1e-9).all():
                out[z, y, x] = min(out[z, y, x], float(np.linalg.norm(step)))
    return out


@pytest.mark.parametrize("seed", range(5))
def test_behind_two_planes_the_distance_is_that_to_their_wedge(seed: int) -> None:
    """Top and cut of a film at random angles, a right one or blunter between them, to 1e-3 um."""
    rng = np.random.default_rng(seed)
    first, second = (0.2 * rng.normal(), 0.2 * rng.normal(), 1.0), tuple(rng.normal(size=3) * [1, 1, 0.3])
    second = second if np.dot(first, second) >= 0 else tuple(-c for c in second)
    offsets = [float(rng.uniform(-1.5, 0)), float(rng.uniform(-1, 1))]
    top, gone = plane(first, offsets[0]), plane(second, offsets[1])
    found = lowered(top, None, gone)
    void = (top >= 0) | (gone >= 0)
    assert np.abs(found - nearest([first, second], offsets, 4.0))[void].max() < 1e-3


def test_a_floor_is_seen_from_below() -> None:
    """A slab from 4 to 5: below it the distance is 4 - z, above it z - 5."""
    top, floor = plane((0, 0, 1), 0.5), plane((0, 0, 1), -0.5)
    found = lowered(top, floor, None)
    for k, z in enumerate(Z):
        if not 4.0 < z < 5.0:
            assert found[k] == pytest.approx(min(max(4.0 - z, z - 5.0), 4.0), abs=1e-5)


def test_only_void_samples_are_lowered_and_only_lowered() -> None:
    top = plane((0, 0, 1), 0.2)
    code = np.where(top < 0, 0, -1).astype(np.int16)
    out = np.full(SHAPE, np.float32(0.7), np.float32)
    surface.lower_to_film(out, code, top, top, top, False, False, Z, 1.0, 1.0, np.float32(4.0), 1.0)
    assert (out[code >= 0] == np.float32(0.7)).all()
    assert out[code < 0] == pytest.approx(np.minimum(top[code < 0], 0.7))


@pytest.mark.parametrize("coverage", [0.3, 0.6])
def test_below_full_coverage_lengths_across_count_longer(coverage: float) -> None:
    """From an upright wall by 1 / coverage, from a flat not at all, from a slope by 1 / hypot(c sin, cos)."""
    for direction in ((1.0, 0.0, 0.0), (0.0, 0.0, 1.0), (0.6, 0.0, 0.8)):
        top = plane(direction, 0.3)
        code = np.where(top < 0, 0, -1).astype(np.int16)
        out = np.full(SHAPE, np.float32(99), np.float32)
        surface.lower_to_film(out, code, top, top, top, False, False, Z, 1.0, 1.0, np.float32(99), coverage)
        share = np.hypot(coverage * direction[0], direction[2])
        assert out[code < 0] == pytest.approx(top[code < 0] / share, rel=1e-4)


@pytest.mark.parametrize(
    ("a", "b", "cosine", "expected"),
    [
        (3.0, 4.0, 0.0, 5.0), (-1.0, 2.0, 0.0, 2.0), (2.0, -1.0, 0.5, 2.0), (-1.0, -2.0, 0.3, -1.0),
        (1.0, 1.0, 0.9999, 1.0), (1.0, 3.0, 0.5, 3.0), (2.0, 2.0, -0.5, 4.0),
    ],
)  # fmt: skip
def test_wedges_by_hand(a: float, b: float, cosine: float, expected: float) -> None:
    """A right angle gives Pythagoras; where the foot lies on a face, that face's distance counts."""
    assert surface.wedge(a, b, cosine) == pytest.approx(expected, rel=1e-3)


@pytest.mark.parametrize("seed", range(4))
def test_depths_are_the_values_of_the_fields_that_end_the_solid(seed: int) -> None:
    """Beside the twin: of all axis edges towards a void, the least value of a field that is zero where that begins."""
    stack = naive.random_stack(seed, n=5, cut_all=False)
    t = stack.topology
    bounds = list(zip(t.fields.top, t.fields.floor, t.fields.gone, strict=True))
    found = surface.solid_depths(
        t.samples, t.row_of, t.code.reshape(-1), t.values, t.strides, t.code.shape, t.count, t.start, t.interval_code,
        t.interval_end,
    )  # fmt: skip
    for row, sample in enumerate(t.samples):
        place = np.unravel_index(sample, t.code.shape)
        best = np.inf
        for axis in range(3):
            for way in (1, -1):
                other = list(place)
                other[axis] += way
                if t.code[place] < 0 or not 0 <= other[axis] < t.code.shape[axis]:
                    continue
                best = min(best, depth_along(t, bounds, place, tuple(other)))
        assert found[row] == pytest.approx(best, abs=1e-5)
    assert np.isfinite(found).sum() > 5


def depth_along(t: object, bounds: naive.Bounds, place: tuple[int, ...], other: tuple[int, ...]) -> float:
    """Value at `place` of the field that is zero where the first void on the way to `other` begins."""
    a, b = ([float(f[at]) for f in t.fields.arrays] for at in (place, other))  # type: ignore[attr-defined]
    low = 0.0
    for code, end in naive.intervals(a, b, bounds):
        if code < 0:
            zero = [abs(u) for u, v in zip(a, b, strict=True) if (u < 0) != (v < 0) and abs(u / (u - v) - low) < 2e-3]
            return min(zero, default=np.inf)
        low = end
    return float("inf")


@pytest.mark.parametrize("cosine", [0.99999, 0.9999999, 0.999999999, 1.0])
def test_one_plane_twice_is_that_plane(cosine: float) -> None:
    """Two planes that are one to rounding, at the same distance: theirs, and not next to nothing."""
    assert surface.wedge(1.0, 1.0, cosine) == pytest.approx(1.0, rel=1e-3)
