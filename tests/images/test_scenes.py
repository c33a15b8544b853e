"""Cut views: drawn off-screen where there is an OpenGL library, and one line where there is none."""

from __future__ import annotations

import json
import subprocess
import sys

import numpy as np
import pytest

from flowemu.errors import RunError
from flowemu.output import opengl
from flowemu.output.deliver import middle_cuts, write_meshes, write_run, write_sections
from flowemu.output.scene import cut_away, draw_scene, view_of
from flowemu.output.solid import film_solids
from flowemu.output.theme import looks_of
from flowemu.record import RunRecord, Shot

needs_opengl = pytest.mark.skipif(opengl.missing_opengl() is not None, reason=str(opengl.missing_opengl()))


@pytest.fixture(scope="module")
def solids(bridge_stack):
    return film_solids(bridge_stack)


@pytest.fixture(scope="module")
def looks(bridge_stack):
    return looks_of(film.material for film in bridge_stack.films)


@pytest.fixture
def record(bridge_stack, bridge_masks) -> RunRecord:
    shot = Shot(14, "step 14: release", bridge_stack)
    grid = bridge_stack.grid
    return RunRecord("Bridge", "0.1.0", "ab", "cd", grid, (), (), (), (), shots=(shot,), masks=bridge_masks)


@needs_opengl
def test_quarter_view_shows_the_films_colours_on_paper(solids, looks, bridge_stack, tmp_path) -> None:
    from matplotlib.image import imread

    view = view_of(bridge_stack.grid, solids)
    path = draw_scene(solids, looks, view, tmp_path / "view.png", "Bridge", "after step 14")
    image = (imread(path)[..., :3] * 255).round().astype(int)[250:, :1500]
    paper = (image == 255).all(axis=2).mean()
    assert 0.3 < paper < 0.9
    for look, least in ((looks[1], 0.02), (looks[4], 0.02), (looks[5], 0.005)):
        fill = np.array([int(look.fill[i : i + 2], 16) for i in (1, 3, 5)])
        near = np.abs(image - fill).max(axis=2) < 40
        assert near.mean() > least, look


def test_quarter_takes_a_quarter_of_a_flat_film(solids, bridge_stack) -> None:
    """The thin nitride has the pit at one side only, so compare with its own mesh clipped by hand."""
    view = view_of(bridge_stack.grid, solids, stretch=3)
    whole, quarter, half = (cut_away(solids[1].solid, view, cut).volume() for cut in ("whole", "quarter", "half"))
    assert whole == pytest.approx(3 * solids[1].solid.volume(), rel=1e-6)
    assert half == pytest.approx(whole / 2, rel=1e-2)
    assert quarter == pytest.approx(0.75 * whole, rel=3e-2)


def test_view_crops_the_bulk_and_keeps_the_pit(solids, bridge_stack) -> None:
    view = view_of(bridge_stack.grid, solids)
    assert -6.0 <= view.bottom < -3.6
    assert view.top == pytest.approx(4.465, abs=0.01)


def test_without_opengl_one_line_says_what_to_install(solids, looks, bridge_stack, tmp_path, monkeypatch) -> None:
    monkeypatch.setattr(opengl, "loads", lambda name: False)
    opengl.missing_opengl.cache_clear()
    try:
        view = view_of(bridge_stack.grid, solids)
        with pytest.raises(RunError, match=r"no 3D views: there is no OpenGL library; install .* libegl1"):
            draw_scene(solids, looks, view, tmp_path / "view.png", "Bridge")
    finally:
        monkeypatch.undo()
        opengl.missing_opengl.cache_clear()
    assert not (tmp_path / "view.png").exists()


def test_trial_that_crashes_does_not_end_this_process(monkeypatch) -> None:
    monkeypatch.setattr(opengl, "TRIAL", "import os; os.abort()")
    opengl.missing_opengl.cache_clear()
    try:
        assert str(opengl.missing_opengl()).startswith("no 3D views")
    finally:
        monkeypatch.undo()
        opengl.missing_opengl.cache_clear()


def test_run_without_opengl_makes_all_else(record, tmp_path, monkeypatch) -> None:
    monkeypatch.setattr("flowemu.output.deliver.missing_opengl", lambda: "no 3D views: install libegl1")
    notes = write_run(record, tmp_path / "out")
    made = {path.relative_to(tmp_path / "out").as_posix() for path in (tmp_path / "out").rglob("*") if path.is_file()}
    assert notes == ["no 3D views: install libegl1"]
    assert {"result.json", "meshes/Bridge.glb", "meshes/Bridge.3mf", "meshes/Bridge.vtm"} <= made
    assert "figures/step14_section_-30_0_30_0.svg" in made
    assert not any(name.startswith("views/") for name in made)
    assert json.loads((tmp_path / "out" / "result.json").read_text())["flow"] == "Bridge"


@needs_opengl
def test_run_makes_views_and_reports_progress(record, tmp_path) -> None:
    told: list[tuple[int, int, str]] = []
    notes = write_run(record, tmp_path / "out", lambda *step: told.append(step))
    assert notes == []
    assert sorted(path.name for path in (tmp_path / "out" / "views").iterdir()) == [
        "step14_half.png",
        "step14_quarter.png",
    ]
    assert told[0] == (0, 2, "figures after step 14: release")


def test_section_and_mesh_commands_return_their_files(record, tmp_path) -> None:
    figures = write_sections(record, [(-30.0, 2.0), (30.0, 2.0)], [14], tmp_path / "out")
    meshes = write_meshes(record, ["glb", "stl"], tmp_path / "out")
    assert [path.suffix for path in figures] == [".svg", ".pdf", ".png"]
    assert len(meshes) == 7
    assert all(path.exists() for path in [*figures, *meshes])


def test_middle_cuts_of_a_flat_grid_run_along_x_alone(bridge_stack) -> None:
    from dataclasses import replace

    grid = bridge_stack.grid
    assert len(middle_cuts(grid)) == 2
    assert middle_cuts(replace(grid, ny=1, y0=0.0)) == [[(-30.0, 0.25), (30.0, 0.25)]]


def test_output_package_loads_no_plotting_library() -> None:
    """`flowemu.output` itself is light; each picture's library is loaded by what draws it."""
    heavy = {"numba", "scipy", "pyvista", "trimesh", "matplotlib"}
    code = f"import sys, flowemu.output; print(sorted({heavy} & set(sys.modules)))"
    told = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert told.stdout.strip() == "[]"
