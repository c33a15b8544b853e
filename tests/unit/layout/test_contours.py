"""Merged contours: no overlaps, no bridges, no shared edges; areas as shapely has them."""

from __future__ import annotations

import numpy as np
import pytest
from shapely import Point, Polygon, unary_union

from flowemu.layout import merge
from flowemu.layout.contours import as_polygons, outlines, segments_of, signed_area
from tests.unit.layout.drawings import circle, square, turned


def test_holes_are_loops_of_their_own() -> None:
    frame = [square(0, 0, 10, 2), square(0, 8, 10, 10), square(0, 0, 2, 10), square(8, 0, 10, 10)]
    loops = merge([*frame, square(4, 4, 6, 6)])
    areas = sorted(signed_area(loop) for loop in loops)
    assert areas == pytest.approx([-36.0, 4.0, 100.0])
    assert sorted(len(loop) for loop in loops) == [4, 4, 4]


@pytest.mark.parametrize("angle", [0.0, np.pi / 4, 0.3, 1.1])
def test_touching_edges_vanish(angle: float) -> None:
    """Three rectangles that share edges in part, turned: one loop of 10 corners, no edge inside."""
    parts = [square(0, 0, 5, 5), square(5, 1, 9, 4), square(0, 5, 2.5, 9)]
    loops = merge([turned(part, angle) for part in parts])
    assert len(loops) == 1
    assert signed_area(loops[0]) == pytest.approx(47.0, abs=1e-3)
    middle = 0.5 * (segments_of(loops)[:, :2] + segments_of(loops)[:, 2:])
    whole = unary_union([Polygon(turned(part, angle)).buffer(1e-9) for part in parts])
    assert max(whole.exterior.distance(point) for point in map(Point, middle)) < 2e-3


def test_gaps_below_a_nanometre_close_and_wider_ones_stay() -> None:
    def gapped(gap: float) -> int:
        return len(merge([turned(square(0, 0, 5, 5), 0.3), turned(square(5 + gap, 0, 9, 5), 0.3)]))

    assert gapped(0.0005) == 1
    assert gapped(0.01) == 2


def test_a_circle_keeps_its_corners() -> None:
    (loop,) = merge([circle(3, 4, 20, 64)] * 2)
    assert len(loop) == 64
    assert np.abs(np.hypot(*(loop - [3, 4]).T) - 20).max() < 2e-6


def test_corners_that_touch_part_two_squares() -> None:
    loops = merge([square(0, 0, 1, 1), square(1, 1, 2, 2)])
    assert [signed_area(loop) for loop in loops] == pytest.approx([1.0, 1.0])


def test_winding_and_self_crossing_do_not_matter() -> None:
    (loop,) = merge([square(0, 0, 4, 4)[::-1]])
    assert signed_area(loop) == pytest.approx(16.0)
    bow = np.array([[0, 0], [4, 4], [4, 0], [0, 4]], dtype=float)
    assert sum(map(signed_area, merge([bow]))) == pytest.approx(8.0)


def test_nothing_drawn_gives_nothing() -> None:
    assert merge([]) == []
    assert merge([[[0, 0], [1, 1]], [[0, 0], [4, 0], [2, 0]]]) == []
    assert segments_of([]).shape == (0, 4)


def test_islands_in_holes_survive_the_way_back() -> None:
    """Contours of nested squares, made polygons with bridges again and outlined once more."""
    nested = [square(0, 0, 20, 20), square(2, 2, 18, 18)[::-1], square(4, 4, 16, 16), square(6, 6, 14, 14)[::-1]]
    loops = outlines([polygon.points for polygon in as_polygons(nested, 1e-6)], 1e-6)
    assert sorted(map(signed_area, loops)) == pytest.approx([-256.0, -64.0, 144.0, 400.0])


def test_random_unions_have_the_area_of_shapely() -> None:
    rng = np.random.default_rng(5)
    for _ in range(10):
        places = rng.uniform(0, 40, (25, 2))
        shapes = [circle(x, y, rng.uniform(1, 8), int(rng.integers(3, 30))) for x, y in places]
        area = unary_union([Polygon(shape) for shape in shapes]).area
        # Closing the sub-nanometre gaps fills notches of at most a few nm2 at each crossing.
        assert sum(map(signed_area, merge(shapes))) == pytest.approx(area, abs=1e-4)


def test_a_large_drawing_keeps_its_precision() -> None:
    """On a 100 mm wafer the rounding step is 1e-9 of the extent, 0.1 nm."""
    loops = merge([square(-5e4, -5e4, -5e4 + 10.1234, 0), square(49990, 49990, 5e4, 5e4)])
    widths = sorted(float(np.ptp(loop[:, 0])) for loop in loops)
    assert widths == pytest.approx([10.0, 10.1234], abs=2e-4)
