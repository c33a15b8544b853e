"""What stands beside a section: the masks with the cut line, the legend, the list of findings."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from textwrap import wrap
from typing import TYPE_CHECKING, Any

import numpy as np

from flowemu.output import theme
from flowemu.output.section import Section
from flowemu.output.theme import Look
from flowemu.stack.film import Film

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flowemu.findings import Finding

MASK_LIGHTNESS, MASK_CHROMA = 0.62, 0.11
ROW_IN = 0.2
SWATCH_IN = 0.3
LINE_IN = 0.17
LETTER_IN = 0.075
LETTERS_PER_IN = 17.0  # of the findings in words
MOST_LINES = 3


def draw_masks(
    axes: Axes,
    masks: Mapping[str, Sequence[np.ndarray]],
    line: Sequence[tuple[float, float]],
    window: tuple[float, float, float, float] | None,
) -> None:
    """A thumbnail of the masks, `(n, 2)` um each polygon, with the cut line from A to B."""
    from matplotlib.collections import PolyCollection

    for colour, polygons in zip(mask_colours(len(masks)), masks.values(), strict=True):
        axes.add_collection(PolyCollection(list(polygons), facecolors=colour, alpha=0.16, linewidths=0))
        axes.add_collection(PolyCollection(list(polygons), facecolors="none", edgecolors=colour, linewidths=0.5))
    points = np.asarray(line)
    axes.plot(points[:, 0], points[:, 1], color=theme.INK, linewidth=1.2, solid_capstyle="butt")
    for name, here, other in (("A", points[0], points[1]), ("B", points[-1], points[-2])):
        away = (here - other) / max(float(np.hypot(*(here - other))), 1e-12)
        axes.annotate(
            name,
            here,
            7.0 * away,
            textcoords="offset points",
            ha="center",
            va="center",
            fontsize=8,
            weight="bold",
            annotation_clip=False,
        )
    axes.autoscale_view()
    if window:
        axes.set_xlim(window[0], window[2])
        axes.set_ylim(window[1], window[3])
    axes.set_aspect("equal", anchor="SW")
    axes.set_xticks([])
    axes.set_yticks([])


def mask_colours(count: int) -> list[str]:
    """Colours of one lightness for `count` masks, evenly round the circle of hues."""
    return [theme.hex_of(MASK_LIGHTNESS, MASK_CHROMA, 360.0 * i / max(count, 1)) for i in range(count)]


def name_masks(figure: Figure, masks: Sequence[str], left: float, top: float, wide: float) -> float:
    """The masks' names in their colours, in rows from `top` down, inches; the height they take."""
    width, height = figure.get_size_inches()
    x, row = 0.0, 0
    for name, colour in zip(masks, mask_colours(len(masks)), strict=True):
        need = LETTER_IN * len(name) + LETTER_IN
        if x > 0 and x + need > wide:
            x, row = 0.0, row + 1
        at = ((left + x) / width, (top - row * LINE_IN) / height)
        figure.text(*at, name, color=colour, fontsize=6.5, va="top", weight="bold")
        x += need
    return (row + 1) * LINE_IN


def draw_legend(figure: Figure, section: Section, looks: Sequence[Look], left: float, top: float) -> None:
    """One row a film that the cut meets, in the order in which they lie: the last film first."""
    shown = [(film, look) for (film, polygon), look in zip(section.films, looks, strict=True) if not polygon.is_empty]
    legend_rows(figure, shown[::-1], left, top)


def legend_rows(figure: Figure, rows: Sequence[tuple[Film, Look]], left: float, top: float) -> None:
    """A swatch and the name of each film, from `top` down, inches."""
    from matplotlib.patches import Rectangle

    width, height = figure.get_size_inches()
    size: Any = {"width": SWATCH_IN / width, "height": 0.14 / height, "transform": figure.transFigure}
    for i, (film, look) in enumerate(rows):
        bottom = top - (i + 1) * ROW_IN
        box = (left / width, (bottom + 0.03) / height)
        inner: Any = {"facecolor": look.fill, "edgecolor": look.faint, "hatch": look.hatch, "linewidth": 0.0}
        figure.add_artist(Rectangle(box, **size, **inner))
        figure.add_artist(Rectangle(box, **size, facecolor="none", edgecolor=look.line, linewidth=0.6))
        at = ((left + SWATCH_IN + 0.08) / width, (bottom + 0.1) / height)
        figure.text(*at, legend_text(film), va="center", fontsize=7.5)


def legend_text(film: Film) -> str:
    """A film's name with its material and state."""
    material = f"{film.material}, {film.state}" if film.state else film.material
    return film.name if film.name == material else f"{film.name}: {material}"


def findings_in_words(near: Sequence[tuple[Finding, float, float]], width_in: float) -> list[tuple[str, str]]:
    """Colour and text of every line that tells of the marked findings, none wider than `width_in`."""
    lines = []
    letters = int(LETTERS_PER_IN * width_in)
    for i, (finding, _, _) in enumerate(near):
        text = f"{i + 1}  {finding.severity} {finding.code}: {finding.text}"
        colour = theme.SEVERITY.get(finding.severity, theme.INK)
        told = wrap(text, letters, subsequent_indent="    ", max_lines=MOST_LINES, placeholder=" …")
        lines += [(colour, line) for line in told]
    return lines


def draw_findings(figure: Figure, lines: Sequence[tuple[str, str]], left: float, top: float, height_in: float) -> None:
    """The marked findings in words below the section."""
    for i, (colour, line) in enumerate(lines):
        figure.text(left, top - (i * LINE_IN + 0.02) / height_in, line, fontsize=7.5, va="top", color=colour)
