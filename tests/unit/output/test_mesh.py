"""Meshes: closed, of the right volume, and the same in every format."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.errors import RunError
from flowemu.output.mesh import Body, named_bodies, trimesh_of, write_mesh_files
from flowemu.output.solid import film_solid, film_solids
from flowemu.output.theme import look_of, looks_of
from flowemu.stack.grid import Grid
from flowemu.stack.measure import film_volume


def mesh_of(film, grid):
    return trimesh_of(Body(film, film_solid(film, grid), look_of(film.material)))


def closed_forms(shapes) -> list[tuple]:
    """Films with their exact volumes, um3, and the relative error allowed at this cell."""
    shell = shapes.film("shell", shapes.ball(10, 5, 1.0, 2.2), shapes.ball(10, 5, 1.0, 2.0))
    thin = shapes.film("thin", shapes.z - 0.13, shapes.z - 0.08)
    strip = shapes.film("strip", shapes.z - 0.13, shapes.z - 0.08, shapes.strip(4.1, 11.3))
    tilted = (shapes.z - 0.2 * (shapes.x - 10.0)) / np.hypot(1.0, 0.2)
    slant = shapes.film("slant", tilted - 0.05, tilted)
    ball = shapes.film("ball", shapes.ball(10, 5, 1.0, 2.0))
    return [
        (shell, 4 / 3 * np.pi * (2.2**3 - 2.0**3), 0.02),
        (thin, 20 * 10 * 0.05, 1e-3),
        (strip, 7.2 * 10 * 0.05, 1e-3),
        (slant, 20 * 10 * 0.05 * np.hypot(1.0, 0.2), 2e-3),
        (ball, 4 / 3 * np.pi * 8.0, 0.03),  # flat faces lie inside: low by (cell / radius)^2 x 0.4
    ]


def test_meshes_close_and_have_the_closed_forms_volume(shapes) -> None:
    for film, volume, allowed in closed_forms(shapes):
        mesh = mesh_of(film, shapes.grid)
        assert mesh.is_watertight, film.name
        assert mesh.volume == pytest.approx(volume, rel=allowed), film.name


def test_field_volume_agrees_with_the_closed_form_and_the_mesh(shapes) -> None:
    """trimesh measures the mesh; the field's own volume is within 1 % for thin films too."""
    for film, volume, allowed in closed_forms(shapes):
        measured = film_volume(film, shapes.grid)
        assert measured == pytest.approx(volume, rel=allowed), film.name
        assert measured == pytest.approx(mesh_of(film, shapes.grid).volume, rel=0.01), film.name


def test_sides_are_the_windows(shapes) -> None:
    """A film that fills the window ends exactly on its sides and on the lowest plane."""
    mesh = mesh_of(shapes.film("wafer", shapes.z + 0.07), shapes.grid)
    x0, y0, x1, y1 = shapes.grid.box
    assert mesh.bounds == pytest.approx(np.array([[x0, y0, shapes.grid.planes[0]], [x1, y1, -0.07]]), abs=1e-6)
    side = np.isclose(mesh.triangles_center[:, 0], x0)
    assert mesh.area_faces[side].sum() == pytest.approx((y1 - y0) * (-0.07 - shapes.grid.planes[0]), rel=1e-6)


def test_one_cell_wide_grid_gives_a_slab(shapes) -> None:
    flat = type(shapes)(Grid(0.0, 0.0, 0.5, 30, 1, np.linspace(-2.0, 3.0, 11)))
    film = flat.film("film", flat.z - 1.1, flat.z, flat.strip(3.3, 9.1))
    mesh = mesh_of(film, flat.grid)
    assert mesh.is_watertight
    assert mesh.volume == pytest.approx(5.8 * 1.1 * 0.5, rel=1e-3)
    assert film_volume(film, flat.grid) == pytest.approx(5.8 * 1.1 * 0.5, rel=1e-3)


def test_sealed_void_is_kept_and_specks_are_dropped(shapes) -> None:
    """Two balls of which one is hollow, and a speck of 1e-4 cells: the volume is the balls' without the hollow's."""
    balls = np.minimum(shapes.ball(5, 5, 1.0, 2.0), shapes.ball(14, 5, 1.0, 2.0))
    speck = np.where((shapes.x == 9.75) & (shapes.y == 5.25) & (shapes.z == shapes.grid.z[10]), -0.03, 1.0)
    film = shapes.film("film", np.minimum(balls, speck), shapes.ball(5, 5, 1.0, 1.2))
    solid = film_solid(film, shapes.grid)
    assert sorted(round(piece.volume() / np.pi) for piece in solid.decompose()) == [-2, 10, 10]
    assert solid.volume() == pytest.approx(4 / 3 * np.pi * (2 * 8.0 - 1.2**3), rel=0.03)


def test_film_of_which_nothing_is_left_has_no_solid(shapes) -> None:
    gone = shapes.film("gone", shapes.z - 1.0, shapes.z, np.full(shapes.grid.shape, 1.0))
    assert film_solid(gone, shapes.grid) is None
    assert film_volume(gone, shapes.grid) == 0.0


def test_every_format_holds_the_same_closed_films(shapes, tmp_path) -> None:
    import pyvista
    import trimesh

    stack = shapes.stack(
        shapes.film("wafer", shapes.z),
        shapes.film("pad", shapes.z - 0.05, shapes.z, shapes.strip(4.0, 9.0)),
        shapes.film("pad", shapes.z - 1.0, shapes.z, shapes.strip(12.0, 15.0)),
    )
    solids = film_solids(stack)
    looks = looks_of(film.material for film in stack.films)
    files = write_mesh_files(solids, looks, tmp_path / "die")
    expected = {name: body.solid.volume() for name, body in named_bodies(solids, looks).items()}
    assert len(expected) == 3
    assert all(path.exists() for path in files)
    for suffix in ("glb", "3mf"):
        scene = trimesh.load(tmp_path / f"die.{suffix}")
        assert scene.units == "micron"
        assert {name: mesh.volume for name, mesh in scene.geometry.items()} == pytest.approx(expected, rel=1e-4)
        assert all(mesh.is_watertight for mesh in scene.geometry.values())
    stl = [trimesh.load(path) for path in sorted(tmp_path.glob("die-*.stl"))]
    assert sorted(mesh.volume for mesh in stl) == pytest.approx(sorted(expected.values()), rel=1e-4)
    assert all(mesh.is_watertight for mesh in stl)
    blocks = pyvista.read(tmp_path / "die.vtm")
    assert dict(zip(blocks.keys(), (block.volume for block in blocks), strict=True)) == pytest.approx(
        expected, rel=1e-4
    )


def test_unknown_format_is_named(shapes, tmp_path) -> None:
    solids = film_solids(shapes.stack(shapes.film("wafer", shapes.z)))
    with pytest.raises(RunError, match="unknown mesh format 'obj'"):
        write_mesh_files(solids, looks_of(["silicon"]), tmp_path / "die", ["obj"])


@pytest.mark.parametrize("seed", range(12))
def test_any_fields_give_a_closed_mesh(seed: int, shapes) -> None:
    """White noise, rounded to halves at every third seed so that many samples are exactly zero."""
    rng = np.random.default_rng(seed)
    rough = Grid(0.0, 0.0, 1.0, 12, 9, np.arange(0.0, 8.0))
    top, floor, gone = (rng.normal(size=rough.shape) for _ in range(3))
    if seed % 3 == 0:
        top, floor, gone = (np.round(2 * field) / 2 for field in (top, floor, gone))
    film = shapes.film("noise", top - 0.3, floor + 0.3, gone - 0.3)
    assert mesh_of(film, rough).is_watertight
