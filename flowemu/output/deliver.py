"""Everything that a run leaves in its output folder: figures, views, meshes and numbers."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from pathlib import Path

from flowemu.output.figure import FORMATS as FIGURE_FORMATS
from flowemu.output.figure import draw_section, save_figure
from flowemu.output.folder import staged
from flowemu.output.mesh import FORMATS as MESH_FORMATS
from flowemu.output.mesh import write_mesh_files
from flowemu.output.opengl import missing_opengl
from flowemu.output.result import result_text
from flowemu.output.scene import draw_scene, view_of
from flowemu.output.section import section_polygons
from flowemu.output.solid import FilmSolid, film_solids
from flowemu.output.theme import looks_of
from flowemu.record import Line, RunRecord, Shot
from flowemu.stack.grid import Grid

Report = Callable[[int, int, str], None]
SCENE_CUTS = ("quarter", "half")


def quiet(done: int, total: int, text: str) -> None:
    """A progress callback that shows nothing."""


def write_run(record: RunRecord, folder: Path, progress: Report = quiet) -> list[str]:
    """Write all outputs of a run; lines that say what could not be made, and why."""
    notes: list[str] = []
    with staged(folder, "run") as staging:
        for i, shot in enumerate(record.shots):
            progress(i, len(record.shots) + 1, f"figures after {shot.title}")
            for line in record.cuts or middle_cuts(record.grid):
                section_files(record, shot, line, staging)
        progress(len(record.shots), len(record.shots) + 1, "meshes and views")
        if record.shots:
            notes += solid_files(record, staging)
        (staging / "result.json").write_text(result_text(record), encoding="utf-8")
    return notes


def write_sections(record: RunRecord, line: Line, steps: Sequence[int], folder: Path) -> list[Path]:
    """Figures along one line after each of the given steps; the files made."""
    with staged(folder, section_name(line)) as staging:
        made = [
            file for shot in record.shots if shot.step in steps for file in section_files(record, shot, line, staging)
        ]
        names = [file.relative_to(staging) for file in made]
    return [folder / name for name in names]


def write_meshes(record: RunRecord, formats: Sequence[str], folder: Path) -> list[Path]:
    """Meshes of the last structure in the given formats; the files made."""
    with staged(folder, "mesh") as staging:
        films = record.shots[-1].stack.films
        solids = film_solids(record.shots[-1].stack)
        (staging / "meshes").mkdir()
        stem = staging / "meshes" / file_name(record.flow)
        made = write_mesh_files(solids, looks_of(film.material for film in films), stem, formats)
        names = [file.relative_to(staging) for file in made]
    return [folder / name for name in names]


def section_files(record: RunRecord, shot: Shot, line: Line, staging: Path) -> list[Path]:
    """One section as `figures/step<NN>_<line>.svg`, `.pdf` and `.png`."""
    section = section_polygons(shot.stack, line)
    last = shot.step == record.shots[-1].step
    figure = draw_section(
        section, record.flow, f"after {shot.title}", record.masks, record.grid.box, record.findings if last else ()
    )
    (staging / "figures").mkdir(exist_ok=True)
    return save_figure(figure, staging / "figures" / f"step{shot.step:02d}_{section_name(line)}", FIGURE_FORMATS)


def solid_files(record: RunRecord, staging: Path) -> list[str]:
    """Meshes of the last structure and cut views of all; a line where views cannot be drawn."""
    solids = [film_solids(shot.stack) for shot in record.shots]
    last = record.shots[-1].stack
    (staging / "meshes").mkdir()
    looks = looks_of(film.material for film in last.films)
    write_mesh_files(solids[-1], looks, staging / "meshes" / file_name(record.flow), MESH_FORMATS)
    missing = missing_opengl()
    if missing:
        return [missing]
    view_files(record, solids, staging)
    return []


def view_files(record: RunRecord, solids: Sequence[list[FilmSolid]], staging: Path) -> None:
    """Cut views as `views/step<NN>_<cut>.png`, all from the same place."""
    view = view_of(record.grid, solids[-1])
    (staging / "views").mkdir()
    for shot, made in zip(record.shots, solids, strict=True):
        looks = looks_of(film.material for film in shot.stack.films)
        for cut in SCENE_CUTS:
            path = staging / "views" / f"step{shot.step:02d}_{cut}.png"
            draw_scene(made, looks, view, path, record.flow, f"after {shot.title}", cut)


def middle_cuts(grid: Grid) -> list[Line]:
    """Cut lines along x and y through the middle of the window; along x alone on a grid one cell wide."""
    x0, y0, x1, y1 = grid.box
    x, y = (x0 + x1) / 2, (y0 + y1) / 2
    lines: list[Line] = []
    if grid.nx > 1 or grid.ny == 1:
        lines.append([(x0, y), (x1, y)])
    if grid.ny > 1:
        lines.append([(x, y0), (x, y1)])
    return lines


def section_name(line: Line) -> str:
    """A cut line as part of a file name."""
    return "section_" + "_".join(f"{value:g}" for point in line for value in point)


def file_name(text: str) -> str:
    """A name as part of a file name."""
    return re.sub(r"[^A-Za-z0-9_.-]+", "_", text).strip("._") or "flow"
