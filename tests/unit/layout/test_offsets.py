"""Bias, corner rounding and thin places, against closed forms."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.errors import LayoutError
from flowemu.layout import grow, merge, round_corners, thin_places
from flowemu.layout.contours import signed_area
from tests.unit.layout.drawings import circle, square


def area(loops: list[np.ndarray]) -> float:
    return sum(map(signed_area, loops))


def test_growing_rounds_outer_corners() -> None:
    """A square of side a grown by b: a^2 + 4 a b + pi b^2, short of it by the arc's polygon."""
    grown = area(grow(merge([square(0, 0, 10, 10)]), 1.0))
    assert 0 <= 100 + 40 + np.pi - grown < 2 * np.pi * 1e-3


def test_shrinking_keeps_outer_corners() -> None:
    (loop,) = grow(merge([square(0, 0, 10, 10)]), -1.0)
    assert sorted(map(tuple, np.round(loop, 5).tolist())) == [(1.0, 1.0), (1.0, 9.0), (9.0, 1.0), (9.0, 9.0)]


def test_holes_shrink_as_the_drawn_area_grows() -> None:
    frame = merge([square(0, 0, 20, 4), square(0, 16, 20, 20), square(0, 0, 4, 20), square(16, 0, 20, 20)])
    holes = [loop for loop in grow(frame, 1.0) if signed_area(loop) < 0]
    assert [signed_area(hole) for hole in holes] == pytest.approx([-100.0])


def test_rounded_corners_lose_what_the_arc_cuts() -> None:
    """(1 - pi/4) r^2 go at each outer corner and come at each inner one; an L has five and one."""
    shape = merge([square(0, 0, 30, 10), square(0, 0, 10, 30)])
    lost = area(shape) - area(round_corners(shape, 2.0))
    assert lost == pytest.approx((5 - 1) * (1 - np.pi / 4) * 4, abs=0.05)


def test_no_bias_and_no_rounding_change_nothing() -> None:
    shape = merge([circle(0, 0, 5, 40)])
    assert grow(shape, 0.0)[0] is shape[0]
    assert round_corners(shape, 0.0)[0] is shape[0]
    assert grow([], 1.0) == [] and round_corners([], 1.0) == []


def test_rounding_that_would_erase_a_line_is_refused() -> None:
    with pytest.raises(LayoutError, match=r"erase a drawn line 1.\d+ um wide at \(0.75, 10\) um"):
        round_corners(merge([square(0, 0, 1.5, 20)]), 1.0)


def test_thin_lines_and_spaces_are_found() -> None:
    """A line of 1.5, and a gap between circles that narrows to 1.0; widths within 3 % of the 2 um asked."""
    shapes = merge([square(0, 0, 1.5, 20), square(10, 0, 20, 20), circle(40, 10, 5, 64), circle(40, 21, 5, 64)])
    gap, line = thin_places(shapes, 2.0)
    assert (gap.kind, line.kind) == ("space", "line")
    assert gap.width == pytest.approx(1.0, abs=0.06) and line.width == pytest.approx(1.5, abs=0.06)
    assert (gap.x, gap.y) == pytest.approx((40.0, 15.5), abs=0.1)
    assert (line.x, line.y) == pytest.approx((0.75, 10.0), abs=0.1)


def test_corners_and_wide_shapes_are_not_thin() -> None:
    """Square corners, inner corners and windows with arcs of many short sides."""
    window = [*circle(0, 0, 21, 96)[:13], *circle(0, 0, 17, 96)[12::-1]]
    cross = merge([square(0, 40, 30, 45), square(10, 30, 15, 60)])
    assert thin_places(cross, 2.0) == []
    assert thin_places(merge([np.array(window)]), 2.0) == []
    assert thin_places([], 2.0) == [] and thin_places(cross, 0.0) == []


def test_the_narrowest_of_many_come_first() -> None:
    lines = merge([square(10 * k, 0, 10 * k + 0.2 * k, 30) for k in range(1, 9)])
    found = thin_places(lines, 2.0, most=3)
    assert [round(place.x) for place in found] == [10, 20, 30]
