"""How far a point or a region is from the drawn area, also against shapely."""

from __future__ import annotations

import numpy as np
import pytest
from shapely import MultiPolygon, Point, Polygon

from flowemu.layout import merge
from flowemu.layout.contours import segments_of
from tests.unit.layout.drawings import circle, square
from tests.unit.layout.nearest import contains, nearest

UNIT = merge([square(0, 0, 1, 1)])


def test_points_and_regions() -> None:
    assert nearest(UNIT, np.array([3.0, 0.5])) == (2.0, (1.0, 0.5))
    assert nearest(UNIT, np.array([0.5, 0.5])) == (0.0, (0.5, 0.5))
    distance, place = nearest(UNIT, square(3, 3, 4, 4))
    assert (distance, place) == (pytest.approx(np.hypot(2, 2)), (1.0, 1.0))


def test_the_nearest_place_may_lie_along_the_regions_side() -> None:
    distance, place = nearest(UNIT, np.array([[3.0, -9.0], [4.0, 0.0], [3.0, 9.0]]))
    assert (distance, place[0] if place else None) == (2.0, 1.0)


@pytest.mark.parametrize(
    "region", [square(-1, 0.2, 4, 0.4), square(0.2, 0.2, 0.4, 0.4), square(-5, -5, 5, 5), square(0.5, 0.5, 3, 3)]
)
def test_overlap_is_no_distance(region: np.ndarray) -> None:
    distance, place = nearest(UNIT, region)
    assert distance == 0.0 and place is not None
    assert Polygon(UNIT[0]).distance(Point(place)) < 1e-9 and Polygon(region).distance(Point(place)) < 1e-9


def test_inside_a_hole_is_outside() -> None:
    ring = merge([square(0, 0, 9, 3), square(0, 6, 9, 9), square(0, 0, 3, 9), square(6, 0, 9, 9)])
    assert contains(segments_of(ring), np.array([[4.5, 4.5], [1.0, 1.0]])).tolist() == [False, True]
    assert nearest(ring, np.array([4.5, 4.0]))[0] == pytest.approx(1.0)


def test_nothing_drawn_is_infinitely_far() -> None:
    assert nearest([], np.array([0.0, 0.0])) == (np.inf, None)


def test_random_regions_agree_with_shapely() -> None:
    rng = np.random.default_rng(3)
    for _ in range(20):
        drawn = [circle(*rng.uniform(0, 30, 2), 2, 7), circle(*rng.uniform(60, 90, 2), 3, 9)]
        region = circle(*rng.uniform(0, 90, 2), 4, 5)
        expected = MultiPolygon([Polygon(shape) for shape in drawn]).distance(Polygon(region))
        assert nearest(merge(drawn), region)[0] == pytest.approx(expected, abs=1e-5)
