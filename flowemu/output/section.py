"""Cross-sections as polygons: the films along a cut line, and the voids between them.

Each field is contoured on its own and the polygons are then intersected and subtracted, so that a
film or gap of a tenth of a cell is drawn at its true thickness. Films that meet at a corner come
from different fields; the slivers left between them are given to a neighbour, so that nothing but a
real void is left open.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from flowemu.output.cut import Cut, Point, cut_along, sampled
from flowemu.stack.film import Film
from flowemu.stack.grid import Grid

if TYPE_CHECKING:
    from flowemu.stack.stack import FilmStack

NUDGE = 1e-6
SPECK = 1e-3
HAIRLINE = 0.04
CORNER_CUT = 0.3
COMPACT = 0.02
TOUCH = 0.01
GOOD_SHARE = 0.3
FLAT_ENOUGH = 1e-3


@dataclass(frozen=True, eq=False)
class Section:
    """What a cut shows, in um: distance along the line, height over the wafer's front face.

    Attributes
    ----------
    line : points (x, y), um
        The cut line inside the window.
    length : float, um
    bottom, top : float, um
        The lower and upper end of what was modelled.
    films : pairs of a film and its polygon, oldest film first, all of the stack; empty where the cut misses it
    voids : polygon
        Where no film is, open space included.
    cell : float, um
    """

    line: tuple[Point, ...]
    length: float
    bottom: float
    top: float
    films: tuple[tuple[Film, BaseGeometry], ...]
    voids: BaseGeometry
    cell: float


def section_polygons(stack: FilmStack, line: Sequence[Point]) -> Section:
    """Cut a film stack along a line of points (x, y), um.

    Error: second order in the cell along a curved surface, none along a plane one; at a corner where
    two films meet up to half a cell.

    Raises
    ------
    RunError
        The line has no length inside the window.
    """
    grid: Grid = stack.grid
    cut = cut_along(grid, line)
    frame = shapely.box(0.0, cut.levels[0], cut.length / cut.cell, cut.levels[-1])
    drawn: list[tuple[Film, BaseGeometry]] = []
    taken: BaseGeometry = shapely.Polygon()
    for film in stack.films:
        solid = shapely.difference(film_polygon(film, grid, cut), taken)
        solid = big_parts(solid, SPECK)
        drawn.append((film, solid))
        taken = shapely.union(taken, solid)
    voids, slivers = sorted_voids(shapely.difference(frame, taken))
    polygons = [to_um(polygon, cut) for polygon in with_slivers([polygon for _, polygon in drawn], slivers)]
    films = tuple((film, polygon) for (film, _), polygon in zip(drawn, polygons, strict=True))
    ends = float(grid.planes[0]), float(grid.planes[-1])
    return Section(cut.line, cut.length, *ends, films, to_um(voids, cut), grid.cell)


def film_polygon(film: Film, grid: Grid, cut: Cut) -> BaseGeometry:
    """A film's polygon in cells: below its top, not gone, not below its floor."""
    solid = negative_region(film.top, grid, cut)
    if film.gone is not None and not solid.is_empty:
        solid = shapely.intersection(solid, negative_region(film.gone, grid, cut))
    if film.floor is not None and not solid.is_empty:
        solid = shapely.difference(solid, negative_region(film.floor, grid, cut))
    return solid


def negative_region(field: np.ndarray, grid: Grid, cut: Cut) -> BaseGeometry:
    """Where a field is negative on the cut, in cells."""
    from contourpy import FillType, contour_generator

    values = sampled(field, grid, cut)
    nudge = NUDGE * grid.cell
    values[np.abs(values) < nudge] = nudge
    generator = contour_generator(cut.along / cut.cell, cut.levels, values, fill_type=FillType.OuterOffset)
    points, offsets = generator.filled(min(float(values.min()), 0.0) - 1.0, 0.0)
    polygons = []
    for ring, ends in zip(points, offsets, strict=True):
        rings = [ring[ends[i] : ends[i + 1]] for i in range(len(ends) - 1)]
        polygons.append(shapely.Polygon(rings[0], rings[1:]))
    return only_areas(shapely.make_valid(shapely.MultiPolygon(polygons)))


def only_areas(geometry: BaseGeometry) -> BaseGeometry:
    """The polygons of a geometry, without the points and lines that an overlay may leave."""
    parts = [part for part in shapely.get_parts(geometry) if part.geom_type == "Polygon"]
    nested = [inner for part in shapely.get_parts(geometry) if "Multi" in part.geom_type for inner in part.geoms]
    return shapely.MultiPolygon(parts + [part for part in nested if part.geom_type == "Polygon"])


def big_parts(geometry: BaseGeometry, least: float) -> BaseGeometry:
    """The polygons of at least `least` cells squared."""
    return shapely.MultiPolygon([part for part in only_areas(geometry).geoms if part.area >= least])


def sorted_voids(empty: BaseGeometry) -> tuple[BaseGeometry, list[BaseGeometry]]:
    """Tell real voids from slivers between films, in cells.

    A sliver is what an opening by `HAIRLINE` removes, or a closed speck below `CORNER_CUT` that is no
    slit: what two differently sampled fields leave at a corner.
    """
    eroded = shapely.buffer(empty, -HAIRLINE, join_style="mitre")
    opened = shapely.intersection(shapely.buffer(eroded, HAIRLINE, join_style="mitre"), empty)
    pieces = list(only_areas(opened).geoms)
    cuts = [part for part in pieces if is_corner_cut(part)]
    voids = shapely.MultiPolygon([part for part in pieces if not is_corner_cut(part)])
    hairlines = only_areas(shapely.difference(empty, opened))
    return voids, [*hairlines.geoms, *cuts]


def is_corner_cut(part: BaseGeometry) -> bool:
    """Whether a void, in cells, is no more than what a corner between films may leave."""
    return bool(part.area < CORNER_CUT and part.area > COMPACT * part.length**2)


def with_slivers(polygons: list[BaseGeometry], slivers: list[BaseGeometry]) -> list[BaseGeometry]:
    """Give each sliver to the newest film that has a good share of its edge: what lay there was laid last."""
    gained: dict[int, list[BaseGeometry]] = {}
    tree = shapely.STRtree(polygons)
    for sliver in slivers:
        reach = shapely.buffer(sliver, TOUCH)
        near = tree.query(reach)
        if len(near):
            shared = shapely.area(shapely.intersection([polygons[i] for i in near], reach))
            newest = int(near[shared >= GOOD_SHARE * shared.max()].max())
            gained.setdefault(newest, []).append(sliver)
    return [
        only_areas(shapely.union_all([polygon, *gained[i]])) if i in gained else polygon
        for i, polygon in enumerate(polygons)
    ]


def to_um(geometry: BaseGeometry, cut: Cut) -> BaseGeometry:
    """From cells to um, without the points that lie on a straight line."""

    def place(points: np.ndarray) -> np.ndarray:
        return np.column_stack([points[:, 0] * cut.cell, np.interp(points[:, 1], cut.levels, cut.heights)])

    finest = min(cut.cell, float(np.diff(cut.heights[1:-1]).min(initial=cut.cell)))
    return shapely.simplify(shapely.transform(geometry, place), FLAT_ENOUGH * finest)
