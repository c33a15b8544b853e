"""Mesh files of a film stack: one closed mesh a film, in um, z up from the wafer's front face."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from io import BytesIO
from itertools import count
from pathlib import Path
from typing import TYPE_CHECKING, Any
from uuid import UUID
from zipfile import ZIP_DEFLATED, ZipFile, ZipInfo

import numpy as np

from flowemu.errors import RunError
from flowemu.output.solid import FilmSolid
from flowemu.output.theme import Look
from flowemu.stack.film import Film

if TYPE_CHECKING:
    from manifold3d import Manifold
    from trimesh import Scene, Trimesh

FORMATS = ("glb", "stl", "3mf", "vtm")


@dataclass(frozen=True, eq=False)
class Body:
    """A film of which something is left: its closed solid, um, and its look."""

    film: Film
    solid: Manifold
    look: Look


def write_mesh_files(
    solids: Sequence[FilmSolid], looks: Sequence[Look], stem: Path, formats: Sequence[str] = FORMATS
) -> list[Path]:
    """Write `stem.glb`, `stem.3mf`, `stem.vtm` and one STL a film; the files and folders made.

    Raises
    ------
    RunError
        A format is none of `FORMATS`.
    """
    named = named_bodies(solids, looks)
    written: list[Path] = []
    for name in formats:
        if name not in WRITERS:
            raise RunError(f"unknown mesh format '{name}'; there are {', '.join(FORMATS)}")
        written += WRITERS[name](named, stem)
    return written


def named_bodies(solids: Sequence[FilmSolid], looks: Sequence[Look]) -> dict[str, Body]:
    """The films of which something is left, under names that no two of them share."""
    named: dict[str, Body] = {}
    for item, look in zip(solids, looks, strict=True):
        name = item.film.name if item.film.name not in named else f"{item.film.name} {item.film.step}"
        if item.solid is not None:
            named[name] = Body(item.film, item.solid, look)
    return named


def trimesh_of(body: Body) -> Trimesh:
    """A film's mesh, um, in the film's colour."""
    import trimesh

    mesh = body.solid.to_mesh64()
    made = trimesh.Trimesh(mesh.vert_properties[:, :3], mesh.tri_verts.astype(np.int64), process=False)
    made.units = "micron"
    made.metadata.update({"film": body.film.name, "material": body.film.material, "step": body.film.step})
    paint = trimesh.visual.material.PBRMaterial(
        name=body.film.material, baseColorFactor=rgba(body.look.fill), metallicFactor=0.0, roughnessFactor=0.7
    )
    made.visual = trimesh.visual.TextureVisuals(material=paint)
    return made


def rgba(colour: str) -> list[int]:
    """`#rrggbb` as four bytes."""
    return [int(colour[i : i + 2], 16) for i in (1, 3, 5)] + [255]


def scene_of(named: dict[str, Body]) -> Scene:
    """All films as one scene, each under its name."""
    import trimesh

    scene = trimesh.Scene()
    for name, body in named.items():
        scene.add_geometry(trimesh_of(body), node_name=name, geom_name=name)
    return scene


def write_glb(named: dict[str, Body], stem: Path) -> list[Path]:
    """One binary glTF file, a coloured mesh a film."""
    path = stem.with_name(f"{stem.name}.glb")
    path.write_bytes(scene_of(named).export(file_type="glb"))
    return [path]


def write_3mf(named: dict[str, Body], stem: Path) -> list[Path]:
    """One 3MF file, an object a film."""
    path = stem.with_name(f"{stem.name}.3mf")
    path.write_bytes(in_microns(scene_of(named).export(file_type="3mf")))
    return [path]


def in_microns(archive: bytes) -> bytes:
    """A 3MF archive with its unit stated as the micron, and without dates and random names."""
    counted = count()
    out = BytesIO()
    with ZipFile(BytesIO(archive)) as given, ZipFile(out, "w", ZIP_DEFLATED) as made:
        for name in given.namelist():
            text = given.read(name).replace(b'unit="millimeter"', b'unit="micron"')
            text = re.sub(rb'UUID="[^"]*"', lambda _: f'UUID="{UUID(int=next(counted))}"'.encode(), text)
            made.writestr(ZipInfo(name), text, ZIP_DEFLATED)
    return out.getvalue()


def write_stl(named: dict[str, Body], stem: Path) -> list[Path]:
    """One binary STL file a film."""
    paths = []
    for name, body in named.items():
        path = stem.with_name(f"{stem.name}-{re.sub(r'[^A-Za-z0-9_.-]+', '_', name)}.stl")
        path.write_bytes(trimesh_of(body).export(file_type="stl"))
        paths.append(path)
    return paths


def write_vtm(named: dict[str, Body], stem: Path) -> list[Path]:
    """One multi-block VTK file and the folder that holds its blocks, a block a film."""
    import pyvista

    blocks = pyvista.MultiBlock()
    for name, body in named.items():
        blocks.append(polydata_of(body), name)
    path = stem.with_name(f"{stem.name}.vtm")
    blocks.save(path)
    return [path, stem.with_name(stem.name)]


def polydata_of(body: Body) -> Any:
    """A film's mesh as pyvista's, with its material, step and colour as field data."""
    import pyvista

    mesh = body.solid.to_mesh64()
    data = pyvista.PolyData.from_regular_faces(mesh.vert_properties[:, :3], mesh.tri_verts.astype(np.int64))
    data.field_data["material"] = [body.film.material]
    data.field_data["step"] = [body.film.step]
    data.field_data["colour"] = [body.look.fill]
    return data


WRITERS: dict[str, Callable[[dict[str, Body], Path], list[Path]]] = {
    "glb": write_glb,
    "stl": write_stl,
    "3mf": write_3mf,
    "vtm": write_vtm,
}
