"""Whether a loose body can leave, and its play, on blocks and walls of known sizes.

Solids are built from their closed forms: a body and what holds it, one film each.
"""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.bodies import find_parts
from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.loose import judge
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology
from tests import stacks


class Shapes:
    """Distances to boxes on a grid of 30 x 30 x 24 cells; z runs from -2 to 22."""

    def __init__(self, nx: int = 30, ny: int = 30) -> None:
        self.grid = stacks.even_grid(nx, -2, 22, ny=ny)
        self.z, self.y, self.x = np.meshgrid(self.grid.z, self.grid.y, self.grid.x, indexing="ij")

    def box(self, x0, x1, y0, y1, z0, z1) -> np.ndarray:
        """Signed distance to a box, exact inside and beside its faces."""
        sides = (x0 - self.x, self.x - x1, y0 - self.y, self.y - y1, z0 - self.z, self.z - z1)
        return np.max(sides, axis=0)

    def stack(self, rest: np.ndarray, *body: np.ndarray) -> FilmStack:
        """A wafer up to z = 0, one film for what is fixed to it and one for the body (top, floor and gone)."""
        top = self.z.astype(np.float32)

        def film(name: str, *fields: np.ndarray) -> Film:
            return Film(name, name, None, 1, *(np.ascontiguousarray(f, np.float32) for f in fields))

        films = (Film("wafer", "silicon", None, 0, top), film("rest", rest), film("body", *body))
        stack = FilmStack(self.grid, films, top)
        stack.__dict__["topology"] = Topology.of(self.grid, films)
        return stack


def verdict(stack: FilmStack):
    (part,) = [p for p in find_parts(stack, {"body": ("body", (15.0, 15.0))}) if p.name == "body"]
    assert not part.held
    return judge(stack, part)


def play_is(found, expected) -> bool:
    """Each of the six to 0.1 cell; None where it has no end."""
    return all(
        (a is None) == (b is None) and (a is None or abs(a - b) < 0.1) for a, b in zip(found, expected, strict=True)
    )


def test_a_block_on_the_wafer_leaves_straight_up():
    """A gap of 1.3 below, walls 2.2 and 3.1 to left and right, none before and behind."""
    s = Shapes()
    body = s.box(12, 18, 12, 18, 1.3, 4)
    walls = np.minimum(s.box(6, 9.8, 5, 25, -2, 9), s.box(21.1, 24, 5, 25, -2, 9))
    found = verdict(s.stack(walls, body))
    assert found.state == "adrift"
    assert play_is(found.play, (2.2, 3.1, None, None, 1.3, None))
    assert "straight up" in found.searched


def under_a_flange(reach: float):
    """A ring round a post with a flange that reaches this far over it; play 1.2 sideways, 0.8 up, 0.6 down."""
    s = Shapes()
    ring = np.maximum(s.box(8, 22, 8, 22, 0.6, 3.6), -s.box(12, 18, 12, 18, -9, 30))
    post = s.box(13.2, 16.8, 13.2, 16.8, -2, 4.4)
    flange = s.box(12 - reach, 18 + reach, 12 - reach, 18 + reach, 4.4, 6.4)
    return s.stack(np.minimum(post, flange), ring)


def ring_verdict(stack: FilmStack):
    (part,) = find_parts(stack, {"body": ("body", (10.0, 15.0))})
    return judge(stack, part)


def test_a_ring_under_a_flange_is_captive_and_its_play_is_the_gaps():
    found = ring_verdict(under_a_flange(2.0))
    assert found.state == "captive"
    assert play_is(found.play, (1.2, 1.2, 1.2, 1.2, 0.6, 0.8))


def test_a_ring_whose_flange_is_too_small_is_adrift():
    """The flange fits through the bore: 18 - 12 = 6 wide, the flange 5.2."""
    found = ring_verdict(under_a_flange(-0.4))
    assert found.state == "adrift"
    assert found.play[5] is None


def test_a_block_in_a_tunnel_slides_out_sideways():
    """A roof over it and a wall on the left: nothing stops it to the right."""
    s = Shapes()
    body = s.box(12, 18, 12, 18, 0.7, 3)
    tunnel = np.minimum(s.box(8, 22, 8, 22, 4.2, 6), s.box(8, 10.5, 8, 22, -2, 6))
    tunnel = np.minimum(tunnel, np.minimum(s.box(8, 22, 8, 10.6, -2, 6), s.box(8, 22, 19.4, 22, -2, 6)))
    found = verdict(s.stack(tunnel, body))
    assert found.state == "adrift"
    assert play_is(found.play, (1.5, None, 1.4, 1.4, 0.7, 1.2))
    assert "to the right" in found.searched


def slotted(mouth: bool) -> FilmStack:
    """A T-shaped body in a T-shaped slot, whose mouth at one end lets its head through or does not.

    Straight up the lips hold it; it has to slide along the slot to the mouth, which ends in a wall, and rise there.
    """
    s = Shapes()
    stem = s.box(13.5, 16.5, 6, 11, 3, 8)
    head = s.box(11, 19, 6, 11, 1, 3.2)
    lips = np.maximum(s.box(5, 25, 4.6, 26, 4.4, 6.4), -s.box(12.4, 17.6, -9, 40, -9, 40))
    if mouth:
        lips = np.maximum(lips, -s.box(9.8, 20.2, 16, 24, -9, 40))
    walls = np.minimum(s.box(5, 9.8, 3, 27, -2, 6.4), s.box(20.2, 25, 3, 27, -2, 6.4))
    ends = np.minimum(s.box(5, 25, 3, 4.6, -2, 14), s.box(5, 25, 24, 27, -2, 14))
    return s.stack(np.minimum(lips, np.minimum(walls, ends)), np.minimum(stem, head))


@pytest.mark.parametrize(("mouth", "state"), [(True, "adrift"), (False, "captive")])
def test_a_body_in_a_slot_leaves_sideways_and_then_up_if_there_is_a_mouth(mouth, state):
    stack = slotted(mouth)
    (part,) = find_parts(stack, {"body": ("body", (15.0, 8.0))})
    found = judge(stack, part)
    assert found.state == state
    assert play_is(found.play, (1.1, 1.1, 1.4, 13.0, 1.0, 1.2))
    assert ("sideways and up" in found.searched) is mouth


def test_a_key_leaves_when_it_is_turned():
    """A bar under two lips that let it out only once it lies along the gap between them."""
    s = Shapes(40, 40)
    bar = s.box(11, 29, 18, 22, 1, 3)
    stem = s.box(18.5, 21.5, 18.5, 21.5, 3, 9)
    lips = np.minimum(s.box(4, 16.5, 4, 36, 4.2, 6), s.box(23.5, 36, 4, 36, 4.2, 6))
    legs = np.minimum(s.box(4, 5, 4, 36, -2, 6), s.box(35, 36, 4, 36, -2, 6))
    stops = np.minimum(s.box(16.5, 23.5, 1, 4, -2, 15), s.box(16.5, 23.5, 36, 39, -2, 15))
    stack = s.stack(np.minimum(np.minimum(lips, legs), stops), np.minimum(bar, stem))
    (part,) = find_parts(stack, {"body": ("body", (20.0, 20.0))})
    found = judge(stack, part)
    assert found.state == "adrift"
    assert "turned" in found.searched


@pytest.mark.parametrize("thickness", [0.3, 0.8])
def test_a_plate_thinner_than_a_cell_has_the_play_of_its_gaps(thickness):
    """A square plate in a well with a lid: 1.4 and 2.1 in x, 1.7 in y, 0.5 below and 0.9 above."""
    s = Shapes()
    body = s.z - 0.5 - thickness, s.z - 0.5, s.box(10, 20, 10, 20, -9, 40)
    lid = np.maximum(s.box(6, 24, 6, 24, -2, 4.0 + thickness), -s.box(8.6, 22.1, 8.3, 21.7, -9, 1.4 + thickness))
    found = verdict(s.stack(lid, *body))
    assert found.state == "captive"
    assert play_is(found.play, (1.4, 2.1, 1.7, 1.7, 0.5, 0.9))


def test_half_a_cell_gives_the_same_play():
    """The ring under its flange on a grid of half the cell: the same play in um, to 0.1 of that cell."""
    coarse = ring_verdict(under_a_flange(2.0)).play
    s = Shapes()
    s.grid = Grid(0.0, 0.0, 0.5, 60, 60, np.linspace(-2, 22, 49))
    s.z, s.y, s.x = np.meshgrid(s.grid.z, s.grid.y, s.grid.x, indexing="ij")
    ring = np.maximum(s.box(8, 22, 8, 22, 0.6, 3.6), -s.box(12, 18, 12, 18, -9, 30))
    rest = np.minimum(s.box(13.2, 16.8, 13.2, 16.8, -2, 4.4), s.box(10, 20, 10, 20, 4.4, 6.4))
    (part,) = find_parts(s.stack(rest, ring), {"body": ("body", (10.0, 15.0))})
    assert judge(s.stack(rest, ring), part).play == pytest.approx(coarse, abs=0.1)
