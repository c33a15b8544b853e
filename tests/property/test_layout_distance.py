"""Whatever is drawn: the mask's distance is shapely's, a turn turns it, a bias only grows it."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from shapely import Polygon, distance, points, unary_union

from flowemu.layout import mask_distance, merge
from flowemu.layout.contours import signed_area

PLACES = np.arange(-6, 6) + 0.5
CORNER = st.integers(-8, 8).map(float)
BOXES = st.lists(st.tuples(CORNER, CORNER, st.integers(1, 6), st.integers(1, 6)), min_size=1, max_size=6)
TRIANGLES = st.lists(arrays(float, (3, 2), elements=st.integers(-9, 9).map(float)), min_size=1, max_size=5)


def corners(x: float, y: float, width: int, height: int) -> np.ndarray:
    return np.array([[x, y], [x + width, y], [x + width, y + height], [x, y + height]])


@settings(max_examples=40, deadline=None, derandomize=True)
@given(BOXES)
def test_boxes_on_a_raster_agree_with_shapely(boxes: list[tuple[float, float, int, int]]) -> None:
    shapes = [corners(*box) for box in boxes]
    agrees_with_shapely(shapes, 1e-5)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(TRIANGLES)
def test_triangles_agree_with_shapely(triangles: list[np.ndarray]) -> None:
    """Once what is narrower than 1.2 nm is closed, as `merge` does to heal slanted edges that touch."""
    shapes = [shape for shape in triangles if abs(signed_area(shape)) > 0.1]
    if shapes:
        agrees_with_shapely(shapes, 1e-3, closed=0.6e-3)


def agrees_with_shapely(shapes: list[np.ndarray], error: float, closed: float = 0.0) -> None:
    drawn = unary_union([Polygon(shape) for shape in shapes])
    if closed:
        drawn = drawn.buffer(closed, join_style="mitre", mitre_limit=20)
        drawn = drawn.buffer(-closed, join_style="mitre", mitre_limit=20)
    samples = points(*np.meshgrid(PLACES, PLACES))
    expected = np.where(drawn.contains(samples), -1, 1) * distance(drawn.boundary, samples)
    assert np.abs(mask_distance(merge(shapes), PLACES, PLACES) - expected).max() < error


@settings(max_examples=25, deadline=None, derandomize=True)
@given(TRIANGLES)
def test_a_quarter_turn_turns_the_distance(triangles: list[np.ndarray]) -> None:
    turned = [np.column_stack([-shape[:, 1], shape[:, 0]]) for shape in triangles]
    before = mask_distance(merge(triangles), PLACES, PLACES)
    after = mask_distance(merge(turned), PLACES, PLACES)
    assert np.abs(np.rot90(before, -1) - after).max() < 1e-4


@settings(max_examples=25, deadline=None, derandomize=True)
@given(BOXES, st.floats(0.05, 2.0))
def test_a_bias_only_grows_what_is_drawn(boxes: list[tuple[float, float, int, int]], bias: float) -> None:
    drawn = merge([corners(*box) for box in boxes])
    plain = mask_distance(drawn, PLACES, PLACES)
    grown = mask_distance(drawn, PLACES, PLACES, bias=bias)
    outside = plain > 0
    assert np.all(grown <= plain + 1e-5)
    assert np.abs(grown - (plain - bias))[outside & (plain > bias)].max(initial=0.0) < 3e-3
