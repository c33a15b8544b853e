"""What is marked in a section: scale bars and numbered findings."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from flowemu.output import theme
from flowemu.output.frame import Frame, round_length
from flowemu.output.section import Section

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from flowemu.findings import Finding

NEAR_CELLS = 3.0
NEAR_SHARE = 0.03
BAR_SHARE = 0.16


def scale_bars(axes: Axes, section: Section, frame: Frame) -> None:
    """A bar along and a bar up, from one corner, both labelled."""
    along, up = frame.points_per_um
    flat = round_length(BAR_SHARE * section.length)
    tall = round_length(0.25 * (frame.top - frame.bottom)) if frame.stretch > 1 else 0.0
    x, z = section.length - 8.0 / along - flat, frame.bottom + 7.0 / up
    box = {"boxstyle": "round,pad=0.15", "facecolor": theme.PAPER, "edgecolor": "none", "alpha": 0.75}
    corner = [(x, z + tall), (x, z), (x + flat, z)] if tall else [(x, z), (x + flat, z)]
    for colour, width in ((theme.PAPER, 3.4), (theme.INK, 1.6)):
        axes.plot(*zip(*corner, strict=True), color=colour, linewidth=width, solid_capstyle="butt", zorder=6)
    axes.annotate(
        f"{flat:g} µm",
        (x + flat / 2, z),
        (0, 4),
        textcoords="offset points",
        ha="center",
        va="bottom",
        fontsize=7,
        zorder=7,
        bbox=box,
    )
    if tall:
        axes.annotate(
            f"{tall:g} µm",
            (x, z + tall),
            (-3, 0),
            textcoords="offset points",
            ha="right",
            va="top",
            fontsize=7,
            zorder=7,
            bbox=box,
        )


def findings_near(section: Section, findings: Sequence[Finding]) -> list[tuple[Finding, float, float]]:
    """Findings whose place is near the cut, with the distance along it and the height, um."""
    import shapely

    line = shapely.LineString(section.line)
    reach = max(NEAR_CELLS * section.cell, NEAR_SHARE * section.length)
    near = []
    for finding in findings:
        if finding.at_um is not None:
            x, y, z = finding.at_um
            point = shapely.Point(x, y)
            if line.distance(point) <= reach:
                near.append((finding, float(line.project(point)), float(z)))
    return near


def mark_findings(axes: Axes, near: Sequence[tuple[Finding, float, float]]) -> None:
    """A numbered mark at each finding's place."""
    bottom, top = axes.get_ylim()
    inset = 0.04 * (top - bottom)
    for i, (finding, along, height) in enumerate(near):
        colour = theme.SEVERITY.get(finding.severity, theme.INK)
        place = (along, float(np.clip(height, bottom + inset, top - inset)))
        axes.plot(
            *place,
            marker="o",
            markersize=9,
            markerfacecolor="none",
            markeredgecolor=theme.PAPER,
            markeredgewidth=2.6,
            zorder=8,
        )
        axes.plot(
            *place,
            marker="o",
            markersize=9,
            markerfacecolor="none",
            markeredgecolor=colour,
            markeredgewidth=1.4,
            zorder=9,
        )
        axes.annotate(
            str(i + 1),
            place,
            (7, 5),
            textcoords="offset points",
            color=theme.PAPER,
            fontsize=7,
            weight="bold",
            zorder=10,
            annotation_clip=False,
            bbox={"boxstyle": "round,pad=0.2", "facecolor": colour, "edgecolor": theme.PAPER, "linewidth": 0.6},
        )
