"""Cross-section figures for a design review, as SVG, PDF and PNG."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from shapely.geometry.base import BaseGeometry

from flowemu.output import theme
from flowemu.output.frame import Frame, frame_of, rings_of
from flowemu.output.labels import label_films
from flowemu.output.marks import findings_near, mark_findings, scale_bars
from flowemu.output.panels import LINE_IN, ROW_IN, draw_findings, draw_legend, draw_masks, findings_in_words, name_masks
from flowemu.output.section import Section
from flowemu.output.theme import Look, looks_of

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flowemu.findings import Finding

FORMATS = ("svg", "pdf", "png")
DPI = 200
STYLE: Any = {
    "svg.hashsalt": "flowemu",
    "svg.fonttype": "path",
    "pdf.fonttype": 42,
    "font.family": "DejaVu Sans",
    "font.size": 8.0,
    "axes.linewidth": 0.6,
    "axes.edgecolor": theme.MUTED,
    "axes.labelcolor": theme.INK,
    "text.color": theme.INK,
    "xtick.color": theme.MUTED,
    "ytick.color": theme.MUTED,
    "xtick.labelcolor": theme.INK,
    "ytick.labelcolor": theme.INK,
    "hatch.linewidth": 0.5,
}
UNDATED: dict[str, dict[str, Any]] = {
    "svg": {"Date": None},
    "pdf": {"CreationDate": None},
    "png": {"Software": None},
}
LEFT_IN, RIGHT_IN, GAP_IN, BELOW_IN, ABOVE_IN = 0.75, 0.2, 0.3, 0.62, 0.95
PANEL_IN = 2.35
THUMB_IN = 1.45
OUTLINE_PT = 0.45
THIN_PT = 1.2
THIN_LINE_PT = 0.9


def draw_section(
    section: Section,
    title: str,
    subtitle: str = "",
    masks: Mapping[str, Sequence[np.ndarray]] | None = None,
    window: tuple[float, float, float, float] | None = None,
    findings: Sequence[Finding] = (),
    stretch: int | None = None,
) -> Figure:
    """Draw one section.

    Parameters
    ----------
    title, subtitle : the flow; the step and whatever else is to be said
    masks : polygons `(n, 2)`, um, by mask name, for the thumbnail
    window : (x0, y0, x1, y1), um, of the thumbnail
    findings : those near the cut are marked in place and listed below
    stretch : vertical scale over horizontal scale; chosen to suit if left out
    """
    import matplotlib
    from matplotlib.figure import Figure

    frame = frame_of(section, stretch)
    near = findings_near(section, findings)
    width = LEFT_IN + max(frame.width_in, 4.0) + GAP_IN + PANEL_IN + RIGHT_IN
    told = findings_in_words(near, width - LEFT_IN - RIGHT_IN)
    height = max(frame.height_in + ABOVE_IN + foot_height(len(told)), panel_height(section, masks))
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(width, height), dpi=DPI, facecolor=theme.PAPER)
        below = height - ABOVE_IN - frame.height_in
        axes = figure.add_axes((LEFT_IN / width, below / height, frame.width_in / width, frame.height_in / height))
        looks = looks_of([film.material for film, _ in section.films])
        draw_films(axes, section, looks, frame)
        label_films(axes, section, looks, frame)
        scale_bars(axes, section, frame)
        mark_findings(axes, near)
        headings(figure, axes, section, frame, title, subtitle)
        left = LEFT_IN + max(frame.width_in, 4.0) + GAP_IN
        draw_panel(figure, left, (width, height), section, looks, masks, window)
        draw_findings(figure, told, LEFT_IN / width, (below - BELOW_IN) / height, height)
    return figure


def foot_height(lines: int) -> float:
    """Room for the axis, the scales and the lines that tell of findings, inches."""
    return BELOW_IN + (LINE_IN * lines + 0.12 if lines else 0.0)


def panel_height(section: Section, masks: Mapping[str, Sequence[np.ndarray]] | None) -> float:
    """Room that the column beside the section needs, inches."""
    shown = sum(not polygon.is_empty for _, polygon in section.films)
    return 0.4 + ROW_IN * shown + (THUMB_IN + 0.28 + 3 * LINE_IN if masks else 0.0)


def draw_films(axes: Axes, section: Section, looks: Sequence[Look], frame: Frame) -> None:
    """Paint the films, thick ones first; each has its own outline, so that no seam can show."""
    from matplotlib.patches import PathPatch

    drawn = [
        (paper_thickness(polygon, frame), polygon, look)
        for (_, polygon), look in zip(section.films, looks, strict=True)
        if not polygon.is_empty
    ]
    for thickness, polygon, look in sorted(drawn, key=lambda item: -item[0]):
        path = path_of(polygon)
        thin = thickness < THIN_PT
        axes.add_patch(
            PathPatch(path, facecolor=look.fill, edgecolor=look.faint, hatch=None if thin else look.hatch, lw=0)
        )
        width = THIN_LINE_PT if thin else OUTLINE_PT
        axes.add_patch(PathPatch(path, facecolor="none", edgecolor=look.line, linewidth=width, joinstyle="round"))
    axes.set_xlim(0.0, section.length)
    axes.set_ylim(frame.bottom, frame.top)
    axes.set_aspect(frame.stretch)


def paper_thickness(polygon: BaseGeometry, frame: Frame) -> float:
    """Mean thickness of a film as drawn, points."""
    from shapely.affinity import scale

    along, up = frame.points_per_um
    paper = scale(polygon, along, up, origin=(0, 0))
    return float(2.0 * paper.area / paper.length) if paper.length else 0.0


def path_of(polygon: BaseGeometry) -> Any:
    """A matplotlib path of a polygon with its holes."""
    from matplotlib.path import Path as Outline

    vertices, codes = [], []
    for ring in rings_of(polygon):
        points = np.asarray(ring.coords)
        vertices.append(points)
        codes += [Outline.MOVETO] + [Outline.LINETO] * (len(points) - 2) + [Outline.CLOSEPOLY]
    return Outline(np.concatenate(vertices), codes)


def headings(figure: Figure, axes: Axes, section: Section, frame: Frame, title: str, subtitle: str) -> None:
    """Title, step, cut line, scales, axes."""
    width, height = figure.get_size_inches()
    ends = " to ".join(f"({x:g}, {y:g})" for x, y in section.line)
    figure.text(LEFT_IN / width, 1 - 0.16 / height, title, fontsize=12, weight="bold", va="top")
    figure.text(LEFT_IN / width, 1 - 0.40 / height, subtitle, fontsize=9, va="top")
    below = f"cut A–B: {ends} µm      {frame.scales()}"
    axes.set_xlabel(f"distance along the cut from A (µm)\n{below}", labelpad=2)
    axes.set_ylabel("height over wafer front (µm)" if frame.height_in > 2.0 else "height (µm)")
    axes.tick_params(width=0.6, length=3, pad=2)
    for name, place, side in (("A", 0.0, "left"), ("B", 1.0, "right")):
        axes.annotate(
            name,
            (place, 1.0),
            (0, 3),
            xycoords="axes fraction",
            textcoords="offset points",
            ha=side,
            va="bottom",
            fontsize=9,
            weight="bold",
        )


def draw_panel(
    figure: Figure,
    left: float,
    size: tuple[float, float],
    section: Section,
    looks: Sequence[Look],
    masks: Mapping[str, Sequence[np.ndarray]] | None,
    window: tuple[float, float, float, float] | None,
) -> None:
    """The column beside the section: the masks with the cut line, then the legend."""
    width, height = size
    top = height - 0.2
    if masks:
        axes = figure.add_axes((left / width, (top - THUMB_IN) / height, PANEL_IN / width, THUMB_IN / height))
        draw_masks(axes, masks, section.line, window)
        top -= THUMB_IN + 0.18
        top -= name_masks(figure, list(masks), left, top, PANEL_IN) + 0.1
    draw_legend(figure, section, looks, left, top)


def save_figure(figure: Figure, stem: Path, formats: Sequence[str] = FORMATS) -> list[Path]:
    """Write a figure as `stem.svg` and so on, byte for byte the same for the same figure."""
    import matplotlib

    written = []
    with matplotlib.rc_context(STYLE):
        for name in formats:
            path = stem.with_name(f"{stem.name}.{name}")
            figure.savefig(path, format=name, dpi=DPI, metadata=UNDATED[name])
            written.append(path)
    return written
