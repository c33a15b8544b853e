"""Films as closed solids: each field's surface, then what lies above one and below the other."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from flowemu.errors import RunError
from flowemu.stack.film import Film
from flowemu.stack.grid import Grid

if TYPE_CHECKING:
    from manifold3d import Manifold

    from flowemu.stack.stack import FilmStack

NUDGE = 1e-3
FAR = 1e6
FLAT_ENOUGH = 2e-3
SPECK = 1e-3


@dataclass(frozen=True, eq=False)
class FilmSolid:
    """A film and its closed solid, um; None where nothing of the film is left."""

    film: Film
    solid: Manifold | None


def film_solids(stack: FilmStack) -> list[FilmSolid]:
    """One closed solid for each film, oldest first, whose flat sides are the window's."""
    return [FilmSolid(film, film_solid(film, stack.grid)) for film in stack.films]


def film_solid(film: Film, grid: Grid) -> Manifold | None:
    """The solid inside a film's top and what is left of it, without what lies below its floor.

    Error: none along plane surfaces, second order in the cell along curved ones, up to half a cell
    at an edge. The three surfaces are found one by one, so a film of a tenth of a cell is exact.
    """
    where = occupied(film)
    if where is None:
        return None
    solid = inside(film.top, grid, where, overhang=False)
    if film.gone is not None:
        solid = solid ^ inside(film.gone, grid, where, overhang=True)
    if film.floor is not None:
        solid = solid - inside(film.floor, grid, where, overhang=True)
    return without_specks(solid.simplify(FLAT_ENOUGH * finest(grid)), grid)


def occupied(film: Film) -> tuple[slice, slice, slice] | None:
    """The box of samples, one to spare, around all cells that hold some of a film."""
    within = near_negative(film.top)
    if film.gone is not None:
        within &= near_negative(film.gone)
    if film.floor is not None:
        within &= near_negative(-film.floor)
    if not within.any():
        return None
    ranges = []
    for axis in range(3):
        held = np.flatnonzero(within.any(axis=tuple(other for other in range(3) if other != axis)))
        ranges.append(slice(max(int(held[0]) - 1, 0), int(held[-1]) + 2))
    return ranges[0], ranges[1], ranges[2]


def near_negative(field: np.ndarray) -> np.ndarray:
    """Samples of which some neighbour, across corners too, or they themselves are not positive."""
    near = field <= 0
    for axis in range(3):
        grown = near.copy()
        ahead = [slice(None)] * 3
        behind = [slice(None)] * 3
        ahead[axis], behind[axis] = slice(1, None), slice(None, -1)
        grown[tuple(ahead)] |= near[tuple(behind)]
        grown[tuple(behind)] |= near[tuple(ahead)]
        near = grown
    return near


def inside(field: np.ndarray, grid: Grid, where: tuple[slice, slice, slice], overhang: bool) -> Manifold:
    """The closed solid where a field is negative, within a box of samples.

    At the window the surface is closed on the window's sides, or a cell beyond with `overhang`, which
    keeps the sides of a solid that is cut from another off the other's.
    """
    import manifold3d

    values = np.clip(field[where], -FAR, FAR, dtype=np.float32)
    values[np.abs(values) < NUDGE * finest(grid)] = NUDGE * finest(grid)
    axes = []
    for axis, (samples, ends) in enumerate(
        ((grid.z, (grid.planes[0], grid.planes[-1])), (grid.y, grid.box[1::2]), (grid.x, grid.box[0::2]))
    ):
        places, copies = closed_axis(samples, ends, where[axis], grid.cell, overhang)
        axes.append(places)
        values = np.take(values, copies, axis=axis)
    for axis in range(3):
        for end in (0, -1):
            face: list[Any] = [slice(None)] * 3
            face[axis] = end
            values[tuple(face)] = FAR
    points, triangles = zero_surface(values, axes)
    if not len(triangles):
        return manifold3d.Manifold()
    solid = manifold3d.Manifold(manifold3d.Mesh64(points, triangles))
    if solid.status() != manifold3d.Error.NoError:
        raise RunError(f"a film's surface does not close ({solid.status().name})")
    return solid


def closed_axis(
    samples: np.ndarray, ends: tuple[float, float], where: slice, cell: float, overhang: bool
) -> tuple[np.ndarray, np.ndarray]:
    """Places and copied sample numbers along one axis, with what closes a surface at either end.

    An outermost sample's value is repeated at the window's edge, and with `overhang` a cell further
    out; a last copy stands at the same place for the closing face, which is thereby flat.
    """
    chosen = np.arange(len(samples))[where]
    low = [ends[0]] if chosen[0] == 0 else []
    high = [ends[1]] if chosen[-1] == len(samples) - 1 else []
    inner = np.concatenate([low, samples[chosen], high])
    if overhang:
        inner = np.concatenate([[inner[0] - cell], inner, [inner[-1] + cell]])
    places = np.concatenate([inner[:1], inner, inner[-1:]])
    first = 1 + len(low) + overhang
    copies = np.clip(np.arange(len(places)) - first, 0, len(chosen) - 1)
    return places, copies


def zero_surface(values: np.ndarray, axes: list[np.ndarray]) -> tuple[np.ndarray, np.ndarray]:
    """Triangles of the surface where `values` `(nz, ny, nx)` are zero, their inside the negative side.

    Returns
    -------
    points : (n, 3) float64, um, in x, y, z
    triangles : (m, 3) uint64
    """
    from vtkmodules.util.numpy_support import numpy_to_vtk, vtk_to_numpy
    from vtkmodules.vtkCommonDataModel import vtkImageData
    from vtkmodules.vtkFiltersCore import vtkFlyingEdges3D

    image = vtkImageData()
    image.SetDimensions(*values.shape[::-1])
    image.GetPointData().SetScalars(numpy_to_vtk(np.ascontiguousarray(values).ravel()))
    surface = vtkFlyingEdges3D()
    surface.SetInputData(image)
    surface.SetValue(0, 0.0)
    for quiet in (surface.ComputeNormalsOff, surface.ComputeGradientsOff, surface.ComputeScalarsOff):
        quiet()
    surface.Update()
    found = surface.GetOutput()
    if not found.GetNumberOfPolys():
        return np.empty((0, 3)), np.empty((0, 3), dtype=np.uint64)
    counted = vtk_to_numpy(found.GetPoints().GetData())
    places = [np.interp(counted[:, i], np.arange(len(axes[2 - i])), axes[2 - i]) for i in range(3)]
    triangles = vtk_to_numpy(found.GetPolys().GetConnectivityArray()).reshape(-1, 3)
    return np.column_stack(places), triangles[:, ::-1].astype(np.uint64)


def without_specks(solid: Manifold, grid: Grid) -> Manifold | None:
    """A solid without the pieces that are only rounding between two surfaces.

    A sealed void is a piece of its own, with a negative volume.
    """
    least = SPECK * grid.cell**2 * finest(grid)
    pieces = solid.decompose()
    kept = [piece for piece in pieces if abs(piece.volume()) > least]
    if not any(piece.volume() > 0 for piece in kept):
        return None
    return solid if len(kept) == len(pieces) else joined(kept)


def joined(pieces: list[Manifold]) -> Manifold:
    """Closed surfaces side by side as one solid, sealed voids included."""
    import manifold3d

    meshes = [piece.to_mesh64() for piece in pieces]
    firsts = np.cumsum([0, *(len(mesh.vert_properties) for mesh in meshes[:-1])])
    points = np.concatenate([mesh.vert_properties[:, :3] for mesh in meshes])
    corners = np.concatenate([mesh.tri_verts + np.uint64(first) for mesh, first in zip(meshes, firsts, strict=True)])
    return manifold3d.Manifold(manifold3d.Mesh64(points, corners))


def finest(grid: Grid) -> float:
    """The smallest spacing of the grid, um."""
    return min(grid.cell, float(grid.dz.min()))
