"""The volume kernel beside its plain twin."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels.volume import row_volumes


def naive_volume(top, floor, gone, dx, dy, dz, fine: int = 12) -> float:
    """Count points of a fine lattice in each cube, fields taken as linear on the cube's six tetrahedra."""
    nz, ny, nx = top.shape
    at = (np.arange(fine) + 0.5) / fine
    w, v, u = np.meshgrid(at, at, at, indexing="ij")
    total = 0.0
    for iz in range(nz + 1):
        for iy in range(ny + 1):
            for ix in range(nx + 1):
                inside = np.ones(u.shape, dtype=bool)
                for field, sign in ((top, 1.0), (floor, -1.0), (gone, 1.0)):
                    z = np.clip([iz - 1, iz], 0, nz - 1)
                    y = np.clip([iy - 1, iy], 0, ny - 1)
                    x = np.clip([ix - 1, ix], 0, nx - 1)
                    inside &= sign * on_tetrahedra(field[np.ix_(z, y, x)], u, v, w) < 0
                total += inside.mean() * dx[ix] * dy[iy] * dz[iz]
    return total


def on_tetrahedra(corners, u, v, w) -> np.ndarray:
    """Walk from the low corner along the largest coordinate first: linear on each of the six tetrahedra."""
    order = np.argsort(-np.stack([u, v, w]), axis=0, kind="stable")
    coordinates = np.stack([u, v, w])
    place = np.zeros((3, *u.shape), dtype=int)
    value = np.full(u.shape, float(corners[0, 0, 0]))
    for step in range(3):
        axis = order[step]
        before = corners[place[2], place[1], place[0]]
        for k in range(3):
            place[k] += axis == k
        along = np.take_along_axis(coordinates, axis[None], axis=0)[0]
        value += along * (corners[place[2], place[1], place[0]] - before)
    return value


@pytest.mark.parametrize("seed", range(4))
def test_volume_agrees_with_counting(seed: int) -> None:
    """Random fields, all three; counting 12 points an edge of each cube is good to about 1 %."""
    rng = np.random.default_rng(seed)
    top, floor, gone = (rng.normal(size=(3, 4, 5)).astype(np.float32) for _ in range(3))
    top -= 0.8
    floor += 0.8
    gone -= 0.8
    dx, dy, dz = (rng.uniform(0.5, 1.5, n) for n in (6, 5, 4))
    assert row_volumes(top, floor, gone, dx, dy, dz).sum() == pytest.approx(
        naive_volume(top, floor, gone, dx, dy, dz), rel=0.01
    )


def test_whole_and_empty_boxes_are_exact() -> None:
    """All of the box, and none of it, whichever field decides; zeros count as outside the solid."""
    shape = (2, 3, 4)
    dx, dy, dz = np.full(5, 0.5), np.full(4, 2.0), np.full(3, 1.5)
    inside, outside = np.full(shape, -1.0, np.float32), np.full(shape, 1.0, np.float32)
    everywhere, nowhere = np.full((1, 1, 1), -1.0, np.float32), np.full((1, 1, 1), 1.0, np.float32)
    box = 2.5 * 8.0 * 4.5
    assert row_volumes(inside, nowhere, everywhere, dx, dy, dz).sum() == pytest.approx(box)
    assert row_volumes(inside, outside, inside, dx, dy, dz).sum() == pytest.approx(box)
    assert row_volumes(outside, nowhere, everywhere, dx, dy, dz).sum() == 0.0
    assert row_volumes(inside, inside, everywhere, dx, dy, dz).sum() == 0.0
    assert row_volumes(inside, nowhere, outside, dx, dy, dz).sum() == 0.0
    assert row_volumes(np.zeros(shape, np.float32), nowhere, everywhere, dx, dy, dz).sum() == 0.0


def test_slab_between_two_planes_in_one_cube_is_exact() -> None:
    """A tenth of a cell, slanting, inside single cubes: thickness x area over the window."""
    z, _, x = np.meshgrid(np.arange(6.0), np.arange(4.0), np.arange(7.0), indexing="ij")
    plane = z - 2.4 - 0.1 * (x - 3.0)
    top, floor = (plane - 0.05).astype(np.float32), (plane + 0.05).astype(np.float32)
    gone = np.full((1, 1, 1), -1.0, np.float32)
    dx = np.array([0.0, *[1.0] * 6, 0.0])
    dy = np.array([0.0, *[1.0] * 3, 0.0])
    dz = np.array([0.0, *[1.0] * 5, 0.0])
    assert row_volumes(top, floor, gone, dx, dy, dz).sum() == pytest.approx(0.1 * 6 * 3, rel=1e-5)
