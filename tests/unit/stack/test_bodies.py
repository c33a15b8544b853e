"""Named parts and bodies: held or loose, their boxes, volumes and contacts."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.bodies import box_and_volume, contact_area, find_parts, part_columns, piece_at, surface_points
from flowemu.steps.models.coating import coat
from tests import stacks


def mushroom(gap: float = 1.4, plate: float = 2.2, anchor: float = 3.0, ny: int = 24):
    """A plate 12 x 12 on a post of this width over a released gap; no post at 0."""
    grid = stacks.even_grid(24, -3, 10, ny=ny)
    x, y = np.meshgrid(grid.x - 12.1, grid.y - 12.1)
    if ny == 1:
        y = np.zeros_like(x)
    square = np.maximum(np.abs(x), np.abs(y))
    stack = coat(stacks.bare(grid, 0.3), stacks.blank("sac"), gap)
    if anchor:
        stack = stacks.printed(stack, anchor / 2 - square)
        stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0}, 1.05 * gap))
    stack = coat(stack, stacks.blank("plate"), plate)
    stack = stacks.printed(stack, square - 6.0)
    stack = stacks.stripped(stacks.beam_etch(stack, {"plate": 1.0}, 1.2 * plate + gap))
    return stack.carve(stacks.front(stack, {"sac": 1.0}).removed(40.0))


PLACE = {"plate": ("plate", (15.0, 12.0))}


def test_a_part_on_a_post_is_held_and_one_without_is_loose():
    assert [(p.name, p.held) for p in find_parts(mushroom(), PLACE)] == [("plate", True)]
    assert [(p.name, p.held) for p in find_parts(mushroom(anchor=0.0), PLACE)] == [("plate", False)]


def test_a_loose_body_without_a_name_gets_one_from_its_film():
    (part,) = find_parts(mushroom(anchor=0.0), {})
    assert (part.name, part.named, part.held) == ("plate piece 1", False, False)


def test_a_name_without_a_part_is_left_out():
    stack = mushroom()
    assert find_parts(stack, {"gone": ("plate", (1.0, 1.0)), "other": ("lost", (12.0, 12.0))}) == []
    assert piece_at(stack, None, 1.0, 1.0) is None
    assert piece_at(stack, None, 12.0, 12.0)[0] == stack.index("plate")


@pytest.mark.parametrize("plate", [2.2])
def test_the_box_and_volume_of_a_loose_plate_are_the_drawn_ones(plate):
    """Sides 12, to 0.1 cell; volume to 2 %. Thinner than a cell the box is known to a cell only."""
    stack = mushroom(anchor=0.0, plate=plate)
    (part,) = find_parts(stack, PLACE)
    box, volume = box_and_volume(stack, part)
    assert box == pytest.approx((6.1, 6.1, 1.7, 18.1, 18.1, 1.7 + plate), abs=0.1)
    assert volume == pytest.approx(144 * plate, rel=0.02)


def test_the_contact_of_a_post_is_its_foot():
    """3 x 3 um2 on the wafer, to a tenth; nothing else touches."""
    stack = mushroom()
    (part,) = find_parts(stack, PLACE)
    assert contact_area(stack, part.pieces) == pytest.approx(9.0, rel=0.1)


def test_columns_and_surface_points_are_the_plates():
    stack = mushroom(anchor=0.0, plate=0.4)
    (part,) = find_parts(stack, PLACE)
    columns = part_columns(stack, part)
    assert columns.sum() == 144
    points = surface_points(stack, part)
    level = points[np.abs(points[:, 2] - 1.9) > 0.19]
    assert np.abs(np.abs(level[:, 2] - 1.9) - 0.2).max() < 0.02


def test_a_part_that_reaches_the_windows_side_says_so():
    grid = stacks.even_grid(20, -3, 8, ny=6)
    stack = coat(stacks.bare(grid, 0.3), stacks.blank("sac"), 1.0)
    stack = coat(stack, stacks.blank("bar"), 1.0)
    stack = stacks.printed(stack, np.broadcast_to(grid.x - 12.0, (6, 20)))
    stack = stacks.stripped(stacks.beam_etch(stack, {"bar": 1.0}, 1.2))
    stack = stack.carve(stacks.front(stack, {"sac": 1.0}).removed(30.0))
    (part,) = find_parts(stack, {"bar": ("bar", (5.0, 3.0))})
    assert (part.held, part.at_side) == (False, True)


@pytest.mark.parametrize("width", [2.0, 2.5, 3.0, 4.0])
def test_a_narrow_anchor_holds_and_its_contact_is_its_foot(width):
    """Posts of two cells and more, at random heights and offsets: always held; contact to whole columns."""
    rng = np.random.default_rng(2)
    for _ in range(4):
        base, offset, gap = rng.uniform(0, 1), rng.uniform(0, 1), rng.uniform(0.5, 4)
        grid = stacks.even_grid(24, -3, 12)
        away = np.abs(grid.x - 12 - offset)
        stack = coat(stacks.bare(grid, base), stacks.blank("sac"), gap)
        stack = stacks.stripped(stacks.beam_etch(stacks.printed(stack, width / 2 - away), {"sac": 1.0}, 1.1 * gap))
        stack = stacks.printed(coat(stack, stacks.blank("plate"), 2.2), away - 8.0)
        stack = stacks.stripped(stacks.beam_etch(stack, {"plate": 1.0}, 2.7 + gap))
        stack = stack.carve(stacks.front(stack, {"sac": 1.0}).removed(40.0))
        (part,) = find_parts(stack, {"plate": ("plate", (17.0, 0.5))})
        assert part.held
        assert contact_area(stack, part.pieces) == pytest.approx(width, abs=0.51)
