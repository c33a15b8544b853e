"""Three-dimensional cut views, drawn off-screen, as PNG."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from flowemu.errors import RunError
from flowemu.output import theme
from flowemu.output.frame import STRETCHES, round_length
from flowemu.output.opengl import missing_opengl
from flowemu.output.solid import FilmSolid
from flowemu.output.theme import Look
from flowemu.stack.grid import Grid

if TYPE_CHECKING:
    from manifold3d import Manifold

CUTS = ("quarter", "half", "whole")
PIXELS_WIDE = 1500
LEAST_PIXELS_HIGH, MOST_PIXELS_HIGH = 650, 1200
MARGIN = 1.12
TOWARDS_EYE = np.array([0.62, -1.0, 0.72])
SHARP_DEG = 32.0
LEAST_SLOPE = 0.10
BASE_SHARE = 0.30
BAR_SHARE = 0.25


@dataclass(frozen=True)
class View:
    """What all views of one run share: the shown box, um, and how far heights are stretched."""

    box: tuple[float, float, float, float]
    bottom: float
    top: float
    stretch: int

    @property
    def centre(self) -> np.ndarray:
        """Middle of the drawn box, heights stretched, `(3,)` um."""
        x0, y0, x1, y1 = self.box
        return np.array([(x0 + x1) / 2, (y0 + y1) / 2, (self.bottom + self.top) / 2 * self.stretch])

    @property
    def size(self) -> np.ndarray:
        """Edges of the drawn box, heights stretched, `(3,)` um."""
        x0, y0, x1, y1 = self.box
        return np.array([x1 - x0, y1 - y0, (self.top - self.bottom) * self.stretch])


def view_of(grid: Grid, solids: Sequence[FilmSolid], stretch: int | None = None) -> View:
    """A view that shows all films, and of the bulk wafer a little below the lowest of them."""
    boxes = [item.solid.bounding_box() for item in solids if item.solid is not None]
    if not boxes:
        raise RunError("there is nothing left to draw")
    top = max(box[5] for box in boxes)
    low = min([box[2] for box in boxes[1:]] + [wafer_low(solids[0], grid)])
    span = max(top - low, 2.0 * grid.cell)
    bottom = max(float(grid.planes[0]), low - BASE_SHARE * span)
    wide = max(grid.box[2] - grid.box[0], grid.box[3] - grid.box[1])
    if stretch is None:
        stretch = next((s for s in STRETCHES if s * span >= LEAST_SLOPE * wide), STRETCHES[-1])
    return View(grid.box, bottom, top, stretch)


def wafer_low(wafer: FilmSolid, grid: Grid) -> float:
    """The lowest height of the wafer's surface above the modelled bottom, um."""
    if wafer.solid is None:
        return float(grid.planes[-1])
    heights = wafer.solid.to_mesh64().vert_properties[:, 2]
    above = heights[heights > grid.planes[0] + 1e-3 * grid.cell]
    return float(above.min()) if len(above) else float(grid.planes[-1])


def draw_scene(
    solids: Sequence[FilmSolid],
    looks: Sequence[Look],
    view: View,
    path: Path,
    title: str,
    subtitle: str = "",
    cut: str = "quarter",
) -> Path:
    """Draw the films with a quarter or half of the window cut away, and write it to `path`.

    Raises
    ------
    RunError
        There is no OpenGL library; the text says what to install.
    """
    from flowemu.output.sheet import save_sheet

    missing = missing_opengl()
    if missing:
        raise RunError(missing)
    pieces = [(item, cut_away(item.solid, view, cut), look) for item, look in zip(solids, looks, strict=True)]
    shown = [(item, piece, look) for item, piece, look in pieces if piece is not None]
    picture, bar = render([(piece, look) for _, piece, look in shown], view)
    legend = [(item.film, look) for item, _, look in reversed(shown)]
    return save_sheet(path, picture, bar, legend, (title, subtitle, f"{cut} view, {scale_text(view)}"))


def scale_text(view: View) -> str:
    """How heights are drawn, in words."""
    return "true proportions" if view.stretch == 1 else f"heights ×{view.stretch}"


def cut_away(solid: Manifold | None, view: View, cut: str) -> Manifold | None:
    """A film without the part towards the eye and without the bulk below the view; heights stretched."""
    import manifold3d

    if solid is None:
        return None
    x0, y0, x1, y1 = view.box
    solid = solid.trim_by_plane((0.0, 0.0, 1.0), view.bottom)
    if cut != "whole":
        start = (x0 + x1) / 2 if cut == "quarter" else x0 - 1.0
        size = (x1 + 1.0 - start, (y1 - y0) / 2 + 1.0, 2.0 * (view.top - view.bottom) + 2.0)
        solid = solid - manifold3d.Manifold.cube(size).translate((start, y0 - 1.0, view.bottom - 1.0))
    return None if solid.is_empty() else solid.scale((1.0, 1.0, float(view.stretch)))


def render(pieces: Sequence[tuple[Manifold, Look]], view: View) -> tuple[np.ndarray, tuple[float, np.ndarray]]:
    """Draw the pieces.

    Returns
    -------
    picture : (height, width, 3) uint8
    bar : length of the scale bar, um, and its two ends, `(2, 2)` in pixels from the picture's top left
    """
    import pyvista

    size = PIXELS_WIDE, pixels_high(view)
    plotter = pyvista.Plotter(off_screen=True, window_size=list(size), lighting="none")
    try:
        plotter.set_background(theme.PAPER)
        light(plotter, view)
        for piece, look in pieces:
            surface = surface_of(piece)
            edges = surface.extract_feature_edges(
                SHARP_DEG, boundary_edges=False, non_manifold_edges=False, manifold_edges=False
            )
            smooth = surface.compute_normals(feature_angle=SHARP_DEG, split_vertices=True)
            plotter.add_mesh(smooth, color=look.fill, smooth_shading=False, ambient=0.42, diffuse=0.66, specular=0.05)
            if edges.n_cells:
                plotter.add_mesh(edges, color=look.line, line_width=1.6, lighting=False)
        ends = scale_bar(plotter, view)
        aim(plotter, view, size)
        plotter.add_axes(line_width=3, color=theme.INK, xlabel="x", ylabel="y", zlabel="z", viewport=(0, 0, 0.13, 0.2))
        plotter.enable_anti_aliasing("ssaa")
        picture = plotter.screenshot(return_img=True)
        return picture, (bar_length(view), np.array([on_paper(plotter, end, size[1]) for end in ends]))
    finally:
        plotter.close()


def surface_of(solid: Manifold) -> Any:
    """A solid's surface as pyvista's."""
    import pyvista

    mesh = solid.to_mesh64()
    return pyvista.PolyData.from_regular_faces(mesh.vert_properties[:, :3], mesh.tri_verts.astype(np.int64))


def light(plotter: Any, view: View) -> None:
    """A main light from behind the eye's left shoulder, and two weak ones that fill the shadows."""
    import pyvista

    for towards, strength in (((-0.5, -1.0, 1.3), 0.75), ((1.2, -0.3, 0.5), 0.35), ((0.2, 0.6, 1.0), 0.2)):
        place = view.centre + np.array(towards) * float(np.linalg.norm(view.size))
        lamp = pyvista.Light(position=tuple(place), focal_point=tuple(view.centre), intensity=strength)
        lamp.positional = False
        plotter.add_light(lamp)


def aim(plotter: Any, view: View, size: tuple[int, int]) -> None:
    """The same parallel view for all scenes of a run: from the front right, above."""
    away = TOWARDS_EYE / np.linalg.norm(TOWARDS_EYE)
    reach = float(np.linalg.norm(view.size))
    plotter.camera_position = [tuple(view.centre + 3.0 * reach * away), tuple(view.centre), (0.0, 0.0, 1.0)]
    plotter.enable_parallel_projection()
    half_wide, half_high = half_extents(view)
    plotter.camera.parallel_scale = MARGIN * max(half_high, half_wide * size[1] / size[0])
    plotter.reset_camera_clipping_range()


def half_extents(view: View) -> tuple[float, float]:
    """Half the width and half the height that the box takes on paper, um."""
    away = TOWARDS_EYE / np.linalg.norm(TOWARDS_EYE)
    right = np.cross([0.0, 0.0, 1.0], away)
    right /= np.linalg.norm(right)
    upward = np.cross(away, right)
    return 0.5 * float(np.abs(right) @ view.size), 0.5 * float(np.abs(upward) @ view.size)


def pixels_high(view: View) -> int:
    """Height of the picture in which the box, at the full width, has no more room above it than beside it."""
    half_wide, half_high = half_extents(view)
    return int(np.clip(PIXELS_WIDE * half_high / half_wide, LEAST_PIXELS_HIGH, MOST_PIXELS_HIGH))


def bar_length(view: View) -> float:
    """Length of the scale bar, um."""
    return round_length(BAR_SHARE * float(view.size[0]))


def scale_bar(plotter: Any, view: View) -> np.ndarray:
    """Draw a bar along the front edge of the window, below it; its two ends, `(2, 3)` um."""
    import pyvista

    x0, y0, _, _ = view.box
    drop = 0.03 * float(np.linalg.norm(view.size))
    start = np.array([x0, y0 - drop, view.bottom * view.stretch])
    ends = np.array([start, start])
    ends[1, 0] += bar_length(view)
    plotter.add_mesh(pyvista.Line(*ends), color=theme.INK, line_width=5, lighting=False)
    return ends


def on_paper(plotter: Any, point: np.ndarray, high: int) -> tuple[float, float]:
    """Where a point is drawn, pixels from the picture's top left."""
    renderer = plotter.renderer
    renderer.SetWorldPoint(*point, 1.0)
    renderer.WorldToDisplay()
    x, y, _ = renderer.GetDisplayPoint()
    return float(x), high - float(y)
