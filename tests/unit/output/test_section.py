"""Sections against the areas and places of analytic shapes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely

from flowemu.errors import RunError
from flowemu.output.section import section_polygons

ALONG_X = [(0.0, 5.0), (20.0, 5.0)]


def areas(section) -> dict[str, float]:
    return {film.name: polygon.area for film, polygon in section.films}


def test_flat_film_of_a_tenth_of_a_cell_has_its_exact_area(shapes) -> None:
    """Area = length x thickness, to 0.1 %; 0.05 um at a cell of 0.5 um."""
    for offset in (0.0, 0.03, 0.11, 0.2):
        wafer = shapes.film("wafer", shapes.z - offset)
        film = shapes.film("film", shapes.z - offset - 0.05, shapes.z - offset)
        section = section_polygons(shapes.stack(wafer, film), ALONG_X)
        assert areas(section)["film"] == pytest.approx(20.0 * 0.05, rel=1e-3)


def test_slanting_line_is_as_long_as_drawn_and_cuts_a_flat_film_exactly(shapes) -> None:
    film = shapes.film("film", shapes.z - 0.3, shapes.z)
    section = section_polygons(shapes.stack(film), [(1.0, 1.0), (13.0, 6.0)])
    assert section.length == pytest.approx(13.0)
    assert areas(section)["film"] == pytest.approx(13.0 * 0.3, rel=1e-3)


def test_free_plate_over_a_gap_of_a_third_of_a_cell_keeps_the_gap(shapes) -> None:
    """A plate of 0.05 um over a gap of 0.15 um, from x = 6 to 14: both areas exact to 1 %, the gap open."""
    wafer = shapes.film("wafer", shapes.z)
    left = np.maximum(-np.minimum(shapes.x - 6.0, 14.0 - shapes.x), -1e3)
    glass = shapes.film("glass", shapes.z - 0.15, shapes.z, -left)
    plate = shapes.film("plate", shapes.z - 0.20, shapes.z - 0.15)
    section = section_polygons(shapes.stack(wafer, glass, plate), ALONG_X)
    gap = shapely.intersection(section.voids, shapely.box(0.0, -1.0, 20.0, 0.19))
    assert areas(section)["plate"] == pytest.approx(20.0 * 0.05, rel=1e-2)
    assert gap.area == pytest.approx(8.0 * 0.15, rel=1e-2)


def test_ball_shell_area_converges_with_second_order(shapes) -> None:
    """A shell through the centre of radii 2 and 2.2: pi (2.2^2 - 2^2), the drawn one no more than 2 % off."""
    shell = shapes.film("shell", shapes.ball(10, 5, 1.0, 2.2), shapes.ball(10, 5, 1.0, 2.0))
    section = section_polygons(shapes.stack(shell), [(0.0, 5.25), (20.0, 5.25)])
    exact = np.pi * (2.2**2 - 2.0**2)
    assert areas(section)["shell"] == pytest.approx(exact, rel=0.02)


def test_films_and_voids_tile_the_frame(shapes) -> None:
    """No place is painted twice and none is left out."""
    stack = stepped(shapes)
    section = section_polygons(stack, ALONG_X)
    pieces = [polygon for _, polygon in section.films] + [section.voids]
    frame = section.length * (section.top - section.bottom)
    assert sum(piece.area for piece in pieces) == pytest.approx(frame, rel=1e-6)
    assert shapely.union_all(pieces).area == pytest.approx(frame, rel=1e-6)


def test_rough_floors_leave_no_slivers_between_films(shapes) -> None:
    """Floors that are off by up to 0.03 cell, as after redistancing: the only void is the open space."""
    rng = np.random.default_rng(4)
    stack = stepped(shapes)
    rough = [stack.films[0]]
    for film in stack.films[1:]:
        noise = rng.uniform(-0.015, 0.015, film.floor.shape).astype(np.float32)
        rough.append(replace(film, floor=film.floor + noise))
    section = section_polygons(shapes.stack(*rough), ALONG_X)
    parts = shapely.get_parts(section.voids)
    assert len(parts) == 1
    assert parts[0].bounds[3] == pytest.approx(section.top)


def test_line_is_clipped_to_the_window_and_keeps_its_direction(shapes) -> None:
    section = section_polygons(shapes.stack(shapes.film("wafer", shapes.z)), [(30.0, 5.0), (10.0, 5.0)])
    assert section.line == ((20.0, 5.0), (10.0, 5.0))


def test_line_with_corners_is_measured_along_its_way(shapes) -> None:
    film = shapes.film("film", shapes.z - 0.3, shapes.z)
    section = section_polygons(shapes.stack(film), [(2.0, 2.0), (8.0, 2.0), (8.0, 6.0)])
    assert section.length == pytest.approx(10.0)
    assert areas(section)["film"] == pytest.approx(3.0, rel=1e-3)


def test_line_beside_the_window_is_refused(shapes) -> None:
    with pytest.raises(RunError, match="does not pass through the window"):
        section_polygons(shapes.stack(shapes.film("wafer", shapes.z)), [(0.0, 20.0), (20.0, 20.0)])


def test_film_that_the_cut_misses_stays_in_the_list(shapes) -> None:
    """The looks of a stack go by its whole order, so every section lists all films."""
    far = shapes.film("far", shapes.z - 1.0, shapes.z, shapes.y - 2.0)
    section = section_polygons(shapes.stack(shapes.film("wafer", shapes.z), far), ALONG_X)
    assert [film.name for film, _ in section.films] == ["wafer", "far"]
    assert section.films[1][1].is_empty


def stepped(shapes):
    """A block on the wafer under a conformal film, the block's edges cut square from a planar distance."""
    block = np.maximum(shapes.z - 0.8, shapes.strip(6.0, 14.0))
    above, aside = np.maximum(shapes.z - 0.8, 0), np.maximum(shapes.strip(6.0, 14.0), 0)
    surface = np.minimum(shapes.z, np.where(block > 0, np.hypot(above, aside), block))
    return shapes.stack(
        shapes.film("wafer", shapes.z),
        shapes.film("block", shapes.z - 0.8, shapes.z, shapes.strip(6.0, 14.0)),
        shapes.film("cover", surface - 0.6, surface),
    )
