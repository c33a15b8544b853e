"""The signed planar distance to a mask, to 0.02 cell and better."""

from __future__ import annotations

import numpy as np
import pytest
from shapely import Polygon, unary_union

from flowemu.layout import FAR, mask_distance, merge
from tests.unit.layout.drawings import circle, square, turned

CELL = 0.5
X = (np.arange(-30, 30) + 0.5) * CELL
Y = (np.arange(-20, 25) + 0.5) * CELL


def box_distance(half_x: float, half_y: float) -> np.ndarray:
    """Closed form for a rectangle about the origin: outside the corner's distance, inside the nearer side's."""
    dx, dy = np.abs(X)[None, :] - half_x, np.abs(Y)[:, None] - half_y
    return np.hypot(np.maximum(dx, 0), np.maximum(dy, 0)) + np.minimum(np.maximum(dx, dy), 0)


def test_a_rectangle_by_its_closed_form() -> None:
    distance = mask_distance(merge([square(-5.3, -2.1, 5.3, 2.1)]), X, Y)
    assert (distance.shape, distance.dtype) == ((45, 60), np.float32)
    assert np.abs(distance - box_distance(5.3, 2.1)).max() < 5e-6


@pytest.mark.parametrize("angle", [0.0, 0.3])
def test_a_shared_edge_leaves_no_line(angle: float) -> None:
    """Two halves and the whole give one field: 2e-3 um, 0.004 cell, where slanted halves are healed."""
    whole = mask_distance(merge([turned(square(-6, -3, 6, 3), angle)]), X, Y)
    halves = [square(-6, -3, 1, 3), square(1, -3, 6, 3), square(-2, -1, 3, 2)]
    parts = mask_distance(merge([turned(half, angle) for half in halves]), X, Y)
    assert np.abs(whole - parts).max() < 2e-3


def test_a_hole_is_outside_and_its_bridge_is_no_edge() -> None:
    ring = merge([square(-8, -8, 8, -3), square(-8, 3, 8, 8), square(-8, -8, -3, 8), square(3, -8, 8, 8)])
    distance = mask_distance(ring, X, Y)
    expected = np.maximum(box_distance(8, 8), -box_distance(3, 3))
    inside = box_distance(8, 8) < 0
    assert np.abs(distance - expected)[inside].max() < 5e-6


def test_bias_grows_with_round_corners_and_shrinks_with_sharp_ones() -> None:
    drawn = merge([square(-5, -3, 5, 3)])
    grown = mask_distance(drawn, X, Y, bias=0.4)
    assert np.abs(grown - (box_distance(5, 3) - 0.4))[box_distance(5, 3) > 0].max() < 2e-3
    shrunk = mask_distance(drawn, X, Y, bias=-0.4)
    assert np.abs(shrunk - box_distance(4.6, 2.6)).max() < 5e-6


def test_shift_moves_the_mask() -> None:
    moved = mask_distance(merge([square(-5, -3, 5, 3)]), X + 1.25, Y - 0.75, shift=(1.25, -0.75))
    assert np.abs(moved - box_distance(5, 3)).max() < 5e-6


def test_rounded_corners_have_their_radius() -> None:
    """A square with corners of radius r is the square of half side a - r grown by r."""
    rounded = mask_distance(merge([square(-5, -5, 5, 5)]), X, Y, rounding=1.5)
    assert np.abs(rounded - (box_distance(3.5, 3.5) - 1.5))[box_distance(3.5, 3.5) > 0].max() < 2e-3


def test_shapes_beyond_the_samples_count() -> None:
    distance = mask_distance(merge([square(100, -500, 200, 500)]), X, Y)
    assert np.abs(distance - np.broadcast_to(100 - X, distance.shape)).max() < 2e-5


def test_nothing_drawn_is_far_everywhere() -> None:
    assert np.all(mask_distance([], X, Y) == np.float32(FAR))
    assert np.all(mask_distance(merge([square(0, 0, 1, 1)]), X, Y, bias=-3.0) == np.float32(FAR))


def test_a_single_row_is_a_cut_through_the_plane() -> None:
    shapes = merge([circle(0, 0, 6, 50), square(4, -1, 12, 1)])
    row = mask_distance(shapes, X, Y[20:21])
    assert np.array_equal(row, mask_distance(shapes, X, Y)[20:21])


def test_rastered_areas_agree_with_shapely() -> None:
    """Cell fractions by distance; an edge cell's error averages out along the outline: 0.2 % of the area here."""
    rng = np.random.default_rng(11)
    shapes = [circle(*rng.uniform(-8, 8, 2), rng.uniform(1, 3), 24) for _ in range(6)]
    x, y = (np.arange(-60, 60) + 0.5) * 0.25, (np.arange(-60, 60) + 0.5) * 0.25
    fraction = np.clip(0.5 - mask_distance(merge(shapes), x, y) / 0.25, 0, 1)
    drawn = unary_union([Polygon(shape) for shape in shapes])
    assert fraction.sum() * 0.25**2 == pytest.approx(drawn.area, rel=2e-3)


def test_the_error_of_a_rastered_disc_falls_with_the_square_of_the_cell() -> None:
    """Area of a 400-sided disc of radius 6.1 by cell fractions; halving the cell cuts the error at least threefold
    on the mean of random offsets (the linear cell fraction is second order along a smooth edge)."""
    rng = np.random.default_rng(2)
    errors = []
    for cell in (1.0, 0.5):
        places = (np.arange(-20 / cell, 20 / cell) + 0.5) * cell
        found = []
        for dx, dy in rng.uniform(0, 1, (12, 2)):
            distance = mask_distance(merge([circle(dx, dy, 6.1, 400)]), places, places)
            found.append(np.clip(0.5 - distance / cell, 0, 1).sum() * cell**2 - np.pi * 6.1**2)
        errors.append(float(np.mean(np.abs(found))))
    assert errors[1] < errors[0] / 3
