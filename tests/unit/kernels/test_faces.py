"""Bare faces beside a count on a lattice that is finer; small grids, so that it runs uncompiled too."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import faces
from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology
from tests import naive_regions as naive

FINE = 12


def bare(stack: FilmStack, stage: list[int]) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Triangles, their films, how many each cell has, and the cells in which a bare surface may end."""
    t, grid = stack.topology, stack.grid
    staged = np.zeros(len(stack.films), np.uint8)
    staged[stage] = 1
    is_open = np.zeros(len(t.piece), np.uint8)
    is_open[t.open_roots] = 1
    source = np.zeros(2 * (len(stack.films) + 1) + 1, np.uint8)
    triangles, films, *_, number, partly = faces.bare_triangles(
        t.cells, t.contents, t.corner_offsets, t.code.shape, t.row_of, t.values, t.code.reshape(-1), t.count, t.start,
        t.interval_code, t.fields.top, t.fields.floor, t.fields.gone, staged, source, is_open, t.piece, grid.z,
        grid.cell, grid.cell,
    )  # fmt: skip
    return triangles, films, number, partly


def normals(triangles: np.ndarray) -> np.ndarray:
    """Half the cross products, whose lengths are the areas, `(n, 3)`."""
    return 0.5 * np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])


def block(width: float, height: float, n: int = 9) -> FilmStack:
    """A square block of film on a wafer whose face lies at z = 2.2, faces off the samples."""
    grid = Grid(0.0, 0.0, 1.0, n, n, np.arange(n + 1.0))
    z, y, x = np.meshgrid(grid.z, grid.y, grid.x, indexing="ij")
    ground, top = z - 2.2, z - 2.2 - height
    gone = np.maximum(np.abs(x - n / 2 - 0.13), np.abs(y - n / 2 - 0.13)) - width / 2
    films = (
        Film("wafer", "silicon", None, 0, ground.astype(np.float32)),
        Film("block", "x", None, 1, top.astype(np.float32), None, gone.astype(np.float32)),
    )
    films = (films[0], Film("block", "x", None, 1, films[1].top, films[0].top, films[1].gone))
    stack = FilmStack(grid, films, films[1].top)
    stack.__dict__["topology"] = Topology.of(grid, films)
    return stack


@pytest.mark.parametrize("height", [0.3, 0.9, 2.1])
def test_a_blocks_faces_have_its_area(height: float) -> None:
    """Sides width x height each, to 2 %; the top width^2 less at most 0.2 um2 a corner, which linear fields cut off."""
    width = 4.1
    triangles, films, _, _ = bare(block(width, height), [1])
    seen = np.abs(normals(triangles)).sum(axis=0)
    assert set(films.tolist()) == {1}
    assert width**2 - 4 * 0.2 < seen[2] < width**2 + 1e-3
    assert seen[:2] == pytest.approx(2 * width * height, rel=0.02)


@pytest.mark.parametrize("seed", range(4))
def test_areas_are_those_counted_on_a_finer_lattice(seed: int) -> None:
    """As seen along x, y and z, to 0.5 um2 and 5 %: a line of the lattice stands for 1/144 um2, and edges of faces
    fall between lines."""
    stack = naive.random_stack(seed)
    code = naive.refined_codes(stack, FINE)
    for k in range(len(stack.films)):
        triangles, films, _, _ = bare(stack, [k])
        assert (films == k).all()
        seen = np.abs(normals(triangles)).sum(axis=0)
        assert seen == pytest.approx(naive.projected_areas(code, k, 1 / FINE), rel=0.05, abs=0.5)


@pytest.mark.parametrize("seed", range(3))
def test_every_triangle_lies_between_its_film_and_the_open_space(seed: int) -> None:
    """A twentieth of a cell to one side of its middle lies the film, to the other the open void: 97 % of the area.

    The rest are slivers along the edges where faces of three films meet.
    """
    fine = 16
    stack = naive.random_stack(seed)
    code = naive.refined_codes(stack, fine)
    opened = naive.open_void(code)
    triangles, films, _, _ = bare(stack, list(range(len(stack.films))))
    normal = normals(triangles)
    area = np.linalg.norm(normal, axis=1)
    keep = area > 1e-6
    unit = normal[keep] / area[keep, None]
    middle = triangles[keep].mean(axis=1)
    middle[:, 2] -= stack.grid.z[0]
    there = []
    for way in (1, -1):
        sides = []
        for side in (1, -1):
            place = np.floor((middle + way * side * 0.075 * unit) * fine).astype(int)
            place = np.clip(place, 0, np.array(code.shape[::-1]) - 1)
            at = place[:, 2], place[:, 1], place[:, 0]
            sides.append(code[at] == films[keep] if side == 1 else opened[at])
        there.append(sides[0] & sides[1])
    right = there[0] | there[1]
    assert area[keep][right].sum() > 0.97 * area.sum()


def test_a_covered_film_has_no_bare_face_and_an_unstaged_one_is_left_out() -> None:
    stack = block(4.1, 1.2)
    lid = Film("lid", "x", None, 2, stack.films[1].top - np.float32(1.0), stack.films[1].top)
    films = (*stack.films, lid)
    covered = FilmStack(stack.grid, films, lid.top)
    covered.__dict__["topology"] = Topology.of(stack.grid, films)
    top_of = [t for t in bare(covered, [1])[0] if (t[:, 2] > 3.3).all()]
    assert top_of == []
    assert len(bare(stack, [])[0]) == 0


def test_triangles_lie_in_their_cells_in_order() -> None:
    stack = naive.random_stack(1)
    t = stack.topology
    triangles, _, number, _ = bare(stack, [0, 1])
    assert number.sum() == len(triangles)
    _, ny, nx = t.code.shape
    cell = np.repeat(t.cells, number)
    corner = np.stack([cell % nx, (cell // nx) % ny, cell // (ny * nx)], axis=1).astype(float)
    corner[:, 2] += stack.grid.z[0]
    inside = (triangles >= corner[:, None] - 1e-9) & (triangles <= corner[:, None] + 1 + 1e-9)
    assert inside.all()


def test_a_cell_in_which_a_bare_surface_ends_is_marked() -> None:
    """The wafer's bare face ends at the block's foot and nowhere else."""
    stack = block(4.1, 1.2)
    _, _, number, partly = bare(stack, [0])
    t = stack.topology
    _, ny, nx = t.code.shape
    marked = t.cells[(partly > 0) & (number > 0)]
    x, y = marked % nx + 0.5, (marked // nx) % ny + 0.5  # the cell's low corner, um
    foot = np.maximum(np.abs(x + 0.5 - 4.63), np.abs(y + 0.5 - 4.63))
    assert len(marked) > 0
    assert (np.abs(foot - 2.05) < 1.0).all()
