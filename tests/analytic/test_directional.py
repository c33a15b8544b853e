"""Directional etches and printed masks against closed forms. Errors are in cells along the normal."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.measure import film_volume
from flowemu.steps.models.coating import coat
from flowemu.steps.models.directional import Beam
from tests import stacks

FILM = 12.3
FLOOR = 0.13
TOP = FLOOR + FILM
OFFSETS = (0.0, 0.21, 0.5, 0.83)


def trench(offset: float, mask: float, depth: float, wall: float, resist: bool):
    """A trench of the given depth through a mask that opens 10.2 + offset to 24.7 - offset."""
    grid = stacks.even_grid(36, -3, 22)
    left, right = 10.2 + offset, 24.7 - offset
    opened = np.minimum(grid.x - left, right - grid.x)
    stack = coat(stacks.bare(grid, FLOOR), stacks.blank("film"), FILM)
    if resist:
        stack = stacks.printed(stack, opened, thickness=mask)
    else:
        stack = stacks.printed(coat(stack, stacks.blank("mask"), mask), opened)
        stack = stacks.stripped(stacks.beam_etch(stack, {"mask": 1.0}, 1.3 * mask))
    return stacks.beam_etch(stack, {"film": 1.0}, depth, wall), left, right


def walls(stack, height: float) -> np.ndarray:
    """Where a level line meets the etched walls of the film, um."""
    gone, grid = stacks.film_of(stack, "film").gone, stack.grid
    return stacks.crossings(stacks.value_at(gone, grid, grid.x, np.full(grid.nx, height)), grid.x)


@pytest.mark.parametrize("wall", [90.0, 88.0, 80.0, 70.0])
@pytest.mark.parametrize(("mask", "resist"), [(2.5, True), (1.0, False), (0.3, False), (0.1, False)])
def test_walls_floor_and_edge_are_where_the_mask_puts_them(wall, mask, resist):
    """Wall at edge + d / tan(wall) to 0.1 along its normal (0.02 right under the mask), floor at the depth to 0.01."""
    lean = 0.0 if wall == 90.0 else 1 / np.tan(np.radians(wall))
    for offset in OFFSETS:
        for depth in (3.0, 7.6):
            stack, left, right = trench(offset, mask, depth, wall, resist)
            assert FILM - stacks.thickness(stack, "film", 17.45) == pytest.approx(depth, abs=0.01)
            for height in np.arange(TOP - depth + 1.0, TOP - 0.02, 0.37):
                exact = np.array([left, right]) + (TOP - height) * lean * np.array([1, -1])
                error = (walls(stack, height) - exact) * np.sin(np.radians(wall))
                assert np.abs(error).max() < 0.1
            assert walls(stack, TOP - 0.02) == pytest.approx([left, right], abs=0.02)


@pytest.mark.parametrize("depth", [0.1, 0.4, 1.3])
def test_a_shallow_cut_takes_its_depth_and_keeps_its_edge(depth):
    """Depth to 2 % of itself; the area cut lacks at most 0.25 cell^2 at either lower corner, which one field rounds."""
    for offset in OFFSETS:
        stack, left, right = trench(offset, 1.0, depth, 90.0, resist=False)
        assert FILM - stacks.thickness(stack, "film", 17.45) == pytest.approx(depth, rel=0.02)
        area = 36 * FILM - film_volume(stacks.film_of(stack, "film"), stack.grid)
        assert area == pytest.approx(depth * (right - left), abs=2 * 0.25)


@pytest.mark.parametrize("angle", [0.0, 0.4, np.pi / 4])
def test_a_printed_edge_lies_on_the_drawn_one(angle):
    """A straight edge at any angle and offset: every crossing on it to 0.02 cell, on either side."""
    grid = stacks.even_grid(24, -3, 8, ny=24)
    x, y = np.meshgrid(grid.x - 12, grid.y - 12)
    for offset in OFFSETS:
        opened = np.cos(angle) * x + np.sin(angle) * y - offset
        resist = stacks.film_of(stacks.printed(stacks.bare(grid, 0.2), opened, thickness=2.0), "resist")
        plane = resist.gone[4]
        for row in range(24):
            at = stacks.crossings(plane[row], grid.x - 12)
            assert np.abs(np.cos(angle) * at + np.sin(angle) * (grid.y[row] - 12) - offset).max(initial=0) < 0.02


def test_a_printed_disc_has_its_radius():
    """A disc of 7 cells: area to a band of 0.02 cell along its rim, and every crossing to 0.02 cell."""
    grid = stacks.even_grid(24, -3, 8, ny=24)
    x, y = np.meshgrid(grid.x - 12.13, grid.y - 11.74)
    resist = stacks.film_of(stacks.printed(stacks.bare(grid, 0.2), np.hypot(x, y) - 7.0, thickness=2.0), "resist")
    assert film_volume(resist, grid) == pytest.approx(np.pi * 49 * 2.0, rel=2 * 0.02 / 7)
    for row in range(24):
        at = stacks.crossings(resist.gone[4][row], grid.x - 12.13)
        assert np.abs(np.hypot(at, grid.y[row] - 11.74) - 7.0).max(initial=0) < 0.02


@pytest.mark.parametrize("angle", [80.0, 65.0])
def test_a_resist_wall_leans_about_its_foot(angle):
    """At height h the edge has drawn back by h / tan(angle), the foot on the drawn edge: to 0.1 along the normal."""
    grid = stacks.even_grid(30, -3, 10)
    for offset in OFFSETS:
        stack = stacks.printed(stacks.bare(grid, 0.2), grid.x - 14.3 - offset, thickness=3.0, wall=angle)
        gone = stacks.film_of(stack, "resist").gone
        for height in np.arange(0.3, 3.0, 0.4):
            at = stacks.crossings(stacks.value_at(gone, grid, grid.x, np.full(grid.nx, height)), grid.x)[0]
            exact = 14.3 + offset - (height - 0.2) / np.tan(np.radians(angle))
            assert abs(at - exact) * np.sin(np.radians(angle)) < 0.1


def over_a_step(cell: float, height: float, thickness: float, over: float, offset: float):
    """A film over a step at x = 18.3 + offset, cleared and overetched; time to clear and the film's area left."""
    grid = stacks.even_grid(round(36 / cell), -3, height + thickness + 6, cell)
    edge = 18.3 + offset
    stack = coat(stacks.bare(grid, 0.13), stacks.blank("base"), height)
    stack = stacks.printed(stack, grid.x - edge)
    stack = stacks.stripped(stacks.beam_etch(stack, {"base": 1.0}, height))
    stack = coat(stack, stacks.blank("film"), thickness)
    beam = Beam(stack, stacks.by_number(stack, {"film": 1.0}))
    clear = beam.clear_time([stack.index("film")])
    after = stack.carve(beam.removed(clear * (1 + over)))
    k = after.index("film")
    return clear, 0.0 if k is None else film_volume(after.films[k], grid) / cell


@pytest.mark.parametrize(("height", "thickness"), [(4.2, 2.3), (3.0, 0.9)])
@pytest.mark.parametrize("over", [0.0, 0.2, 0.5])
def test_a_stringer_stays_on_a_wall(height, thickness, over):
    """What is left is the film's top moved down by the depth: its area to 0.1 cell of the wall's height.

    Top of a conformal film beside an upright wall: height + sqrt(thickness^2 - x^2). Clearing means the flat, so its
    time is thickness / rate to 1 %. A wall film under half a cell can still be lost between two columns.
    """
    x = np.linspace(0, thickness, 4001)
    left = np.maximum(height + np.sqrt(thickness**2 - x**2) - thickness * (1 + over), 0).mean() * thickness
    for offset in (0.0, 0.4, 0.7):
        clear, area = over_a_step(1.0, height, thickness, over, offset)
        assert clear == pytest.approx(thickness, rel=0.01)
        assert area == pytest.approx(left, abs=0.1 * height)


@pytest.mark.parametrize(("height", "thickness"), [(4.2, 2.3), (3.0, 0.4)])
def test_a_stringer_goes_when_the_overetch_is_the_walls_height(height, thickness):
    """Over = height / thickness clears it; nothing is left from 5 % more on."""
    for offset in (0.0, 0.4, 0.7):
        assert over_a_step(1.0, height, thickness, 1.05 * height / thickness, offset)[1] == 0.0


def test_a_mask_that_erodes_lets_the_beam_through_when_it_is_gone():
    """A mask of 1 um at a tenth of the rate lasts 10 s; of 15 s the last 5 reach the film below it."""
    grid = stacks.even_grid(30, -3, 22)
    stack = coat(stacks.bare(grid, 0.13), stacks.blank("film"), FILM)
    stack = stacks.printed(stack, grid.x - 15.2, thickness=1.0)
    assert stack.carve(Beam(stack, {1: 1.0, 2: 0.1}).removed(8.0)).index("resist") is not None
    after = stack.carve(Beam(stack, {1: 1.0, 2: 0.1}).removed(15.0))
    assert after.index("resist") is None
    assert FILM - stacks.thickness(after, "film", 5.0) == pytest.approx(5.0, abs=0.02)
    assert stacks.thickness(after, "film", 25.0) == 0.0


def test_films_in_the_beams_way_take_their_times():
    """Through 2 um at 2 um/s and 3 um at 0.5 um/s in 7 s; after 5 s two thirds of the lower one are left."""
    grid = stacks.even_grid(6, -3, 12)
    stack = coat(coat(stacks.bare(grid, 0.4), stacks.blank("lower"), 3.0), stacks.blank("upper"), 2.0)
    beam = Beam(stack, stacks.by_number(stack, {"lower": 0.5, "upper": 2.0}))
    assert beam.clear_time([1, 2]) == pytest.approx(7.0, rel=1e-3)
    after = stack.carve(beam.removed(3.0))
    assert stacks.thickness(after, "lower", 3.0) == pytest.approx(2.0, abs=0.01)
    assert after.index("upper") is None


def test_a_film_under_an_overhang_is_in_its_shadow():
    """Undercut by 4 cells below a mask, then etched from above: what the mask shades stays."""
    grid = stacks.even_grid(30, -12, 14)
    stack = coat(stacks.bare(grid, 0.13), stacks.blank("film"), 6.0)
    stack = coat(stack, stacks.blank("mask"), 1.0)
    stack = stacks.printed(stack, np.abs(grid.x - 15.0) * -1 + 5.3)
    stack = stacks.stripped(stacks.beam_etch(stack, {"mask": 1.0}, 1.2))
    stack = stacks.wet_etch(stack, {"film": 1.0}, 10.0)
    stack = stacks.beam_etch(stack, {"wafer": 1.0}, 5.0)
    gone = stacks.film_of(stack, "wafer").gone
    at = stacks.crossings(stacks.value_at(gone, grid, grid.x, np.full(grid.nx, -2.0)), grid.x)
    assert at == pytest.approx([9.7, 20.3], abs=0.1)
