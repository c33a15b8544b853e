"""Every output of every flow is there and can be read by the programs that read such files."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
import pytest

from tests.end_to_end.conftest import Done

Ran = Callable[[str], Done]
FLOWS = ["comb", "comb_unanchored", "rotor", "rotor_short_release"]
KEYS = {
    "": ["flow", "version", "masks_sha256", "grid", "steps", "films", "parts", "windows", "findings"],
    "grid": ["cell_um", "shape_zyx", "cells"],
    "steps": ["index", "verb", "name", "seconds", "removed_um3", "added_um3"],
    "films": ["name", "material", "step", "volume_um3"],
    "parts": ["name", "films", "volume_um3", "box_um", "state", "contact_um2", "play_um"],
    "findings": ["code", "severity", "step", "film", "part", "at_um", "text", "cause"],
}
STATES = {"held", "captive", "adrift", "gone", "cut by the window"}


def one(folder: Path, pattern: str) -> Path:
    """The one file that fits a pattern."""
    (file,) = folder.glob(pattern)
    return file


def films_on_grid(done: Done) -> dict[str, float]:
    """Volumes by film as the fields have them, um3."""
    return {film["name"]: film["volume_um3"] for film in done.result["films"]}


@pytest.mark.parametrize("name", FLOWS)
def test_the_numbers_have_exactly_the_stated_keys(ran: Ran, name: str) -> None:
    result = ran(name).result
    assert list(result) == KEYS[""]
    assert list(result["grid"]) == KEYS["grid"]
    for key in ("steps", "films", "parts"):
        assert result[key]
        assert all(list(row) == KEYS[key] for row in result[key])
    assert all(list(row)[: len(KEYS["findings"])] == KEYS["findings"] for row in result["findings"])
    assert {part["state"] for part in result["parts"]} <= STATES
    assert result["windows"] == []
    assert [step["index"] for step in result["steps"]] == list(range(1, len(result["steps"]) + 1))
    shape = result["grid"]["shape_zyx"]
    assert result["grid"]["cells"] == shape[0] * shape[1] * shape[2]


@pytest.mark.parametrize("name", FLOWS)
def test_the_figures_can_be_read(ran: Ran, name: str) -> None:
    from matplotlib.image import imread

    figures = ran(name).folder / "figures"
    stems = {file.stem for file in figures.iterdir()}
    assert len(stems) == 2
    for stem in stems:
        svg = ElementTree.parse(figures / f"{stem}.svg").getroot()
        assert svg.tag.endswith("svg")
        pdf = (figures / f"{stem}.pdf").read_bytes()
        assert pdf.startswith(b"%PDF-")
        assert pdf.rstrip().endswith(b"%%EOF")
        assert np.ptp(imread(figures / f"{stem}.png")[..., :3]) > 0.5


@pytest.mark.parametrize("name", FLOWS)
def test_the_views_show_something(ran: Ran, name: str) -> None:
    from matplotlib.image import imread

    from flowemu.output.opengl import missing_opengl

    done = ran(name)
    missing = missing_opengl()
    if missing:
        assert missing in done.out
        pytest.skip(missing)
    views = sorted((done.folder / "views").iterdir())
    assert len(views) == 2
    for view in views:
        picture = imread(view)[..., :3]
        assert (picture < 0.9).any(axis=2).mean() > 0.1


@pytest.mark.parametrize("name", FLOWS)
def test_the_meshes_are_closed_and_enclose_the_films(ran: Ran, name: str) -> None:
    """Each film's volume by trimesh agrees with that by its fields: within 1 %, half a per cent for the wafer."""
    import trimesh

    done = ran(name)
    wanted = films_on_grid(done)
    scene = trimesh.load(one(done.folder, "meshes/*.glb"), force="scene")
    assert set(scene.geometry) == set(wanted)
    for film, mesh in scene.geometry.items():
        assert mesh.is_watertight, film
        assert mesh.is_winding_consistent, film
        assert float(mesh.volume) == pytest.approx(wanted[film], rel=0.01), film
        stl = trimesh.load(one(done.folder, f"meshes/*-{film}.stl"))
        assert stl.is_watertight, film
        assert float(stl.volume) == pytest.approx(float(mesh.volume), rel=1e-4)


@pytest.mark.parametrize("name", FLOWS)
def test_the_packed_meshes_hold_the_same_films(ran: Ran, name: str) -> None:
    import pyvista
    import trimesh

    done = ran(name)
    wanted = films_on_grid(done)
    packed = trimesh.load(one(done.folder, "meshes/*.3mf"), force="scene")
    assert set(packed.geometry) == set(wanted)
    assert all(mesh.is_watertight for mesh in packed.geometry.values())
    blocks = pyvista.read(one(done.folder, "meshes/*.vtm"))
    assert set(blocks.keys()) == set(wanted)
    for film in wanted:
        assert blocks[film].n_open_edges == 0
        assert blocks[film].volume == pytest.approx(wanted[film], rel=0.01)


def test_result_json_has_no_numbers_that_json_does_not_know(ran: Ran) -> None:
    def refuse(text: str) -> Any:
        raise AssertionError(text)

    json.loads((ran("comb_unanchored").folder / "result.json").read_text(), parse_constant=refuse)
