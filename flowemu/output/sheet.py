"""The sheet around a rendered scene: title, legend, the scale bar's length."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from flowemu.output import theme
from flowemu.output.figure import PANEL_IN, STYLE, UNDATED
from flowemu.output.panels import legend_rows
from flowemu.output.theme import Look
from flowemu.stack.film import Film

PER_INCH = 200
ABOVE_IN = 0.65
MARGIN_IN = 0.2


def save_sheet(
    path: Path,
    picture: np.ndarray,
    bar: tuple[float, np.ndarray],
    legend: Sequence[tuple[Film, Look]],
    texts: tuple[str, str, str],
) -> Path:
    """Write a picture `(height, width, 3)` uint8 with its title, step, scale and legend as PNG.

    `bar` is the scale bar's length, um, and its ends in the picture, `(2, 2)` pixels.
    """
    import matplotlib
    from matplotlib.figure import Figure

    wide, high = picture.shape[1] / PER_INCH, picture.shape[0] / PER_INCH
    width, height = wide + PANEL_IN + 2 * MARGIN_IN, high + ABOVE_IN
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(width, height), dpi=PER_INCH, facecolor=theme.PAPER)
        axes = figure.add_axes((MARGIN_IN / width, 0.0, wide / width, high / height))
        axes.imshow(picture, interpolation="none")
        axes.set_axis_off()
        length, ends = bar
        axes.annotate(f"{length:g} µm", ends.mean(axis=0), (-3, -6), textcoords="offset points", ha="right", va="top")
        title, subtitle, scale = texts
        figure.text(MARGIN_IN / width, 1 - 0.14 / height, title, fontsize=12, weight="bold", va="top")
        line = "      ".join(text for text in (subtitle, scale) if text)
        figure.text(MARGIN_IN / width, 1 - 0.38 / height, line, fontsize=9, va="top")
        legend_rows(figure, legend, MARGIN_IN + wide + 0.05, height - ABOVE_IN)
        figure.savefig(path, format="png", dpi=PER_INCH, metadata=UNDATED["png"])
    return path
