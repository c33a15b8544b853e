"""Film names over a section, each with a line down to its film."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from flowemu.output import theme
from flowemu.output.frame import Frame
from flowemu.output.section import Section
from flowemu.output.theme import Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes

LETTER_PT = 4.6
APART_PT = 10.0
INDENT_PT = 18.0
PLACES = 96
ROOMY_PT = 7.0
CROSSING = 3.0
CROWDED = 6.0


def label_films(axes: Axes, section: Section, looks: Sequence[Look], frame: Frame) -> None:
    """Name each film above the drawing, with a line down to it; the legend alone if they do not fit."""
    along, _ = frame.points_per_um
    shown = [(film.name, polygon, look) for (film, polygon), look in zip(section.films, looks, strict=True)]
    shown = [item for item in shown if not item[1].is_empty]
    widths = np.array([LETTER_PT * len(name) + APART_PT for name, _, _ in shown])
    room = section.length * along - 2 * INDENT_PT
    if not shown or widths.sum() > room:
        return
    anchors = choose_anchors([polygon for _, polygon, _ in shown], widths / along, frame)
    order = np.argsort([x for x, _ in anchors], kind="stable")
    wanted = np.array([anchors[i][0] for i in order]) * along
    places = spread(wanted, widths[order], INDENT_PT, INDENT_PT + room)
    for i, place in zip(order, places, strict=True):
        leader(axes, shown[i][0], anchors[i], (place / along, frame.top), shown[i][2].fill)


def leader(axes: Axes, name: str, anchor: tuple[float, float], place: tuple[float, float], fill: str) -> None:
    """One name, its line and the dot in which the line ends."""
    axes.annotate(
        name,
        xy=anchor,
        xytext=place,
        ha="center",
        va="bottom",
        fontsize=7.5,
        annotation_clip=False,
        bbox={"boxstyle": "square,pad=0.25", "facecolor": "none", "edgecolor": "none"},
        arrowprops={
            "arrowstyle": "-",
            "linewidth": 0.5,
            "color": theme.INK,
            "shrinkA": 0,
            "shrinkB": 0,
            "relpos": (0.5, 0.0),
        },
    )
    axes.plot(
        *anchor,
        marker="o",
        markersize=2.6,
        markerfacecolor=fill,
        markeredgecolor=theme.INK,
        markeredgewidth=0.6,
        zorder=5,
    )


def choose_anchors(polygons: Sequence[BaseGeometry], apart: np.ndarray, frame: Frame) -> list[tuple[float, float]]:
    """A point in each film, um: where it is thick, little lies above it, and no other name is near.

    `apart` `(n,)` um is how much room each name takes.
    """
    places = (np.arange(PLACES) + 0.5) * frame.length / PLACES
    spans = [column_spans(polygon, places, frame) for polygon in polygons]
    _, up = frame.points_per_um
    anchors: list[tuple[float, float]] = []
    for k, (low, high) in enumerate(spans):
        above = sum(np.nan_to_num(other_high - high) > 0 for _, other_high in spans)
        room = np.nan_to_num(np.minimum((high - low) * up, ROOMY_PT), nan=-ROOMY_PT)
        score = (
            np.convolve(np.pad(room, 3, constant_values=-ROOMY_PT), np.full(7, 1 / 7), mode="valid") - CROSSING * above
        )
        for j, (x, _) in enumerate(anchors):
            score -= CROWDED * np.maximum(0.0, 1.0 - np.abs(places - x) / (0.6 * (apart[j] + apart[k])))
        score[np.isnan(high)] = -np.inf
        best = int(np.argmax(score))
        middle = 0.5 * (low[best] + high[best])
        anchors.append((places[best], middle) if np.isfinite(score[best]) else fallback(polygons[k]))
    return anchors


def column_spans(polygon: BaseGeometry, places: np.ndarray, frame: Frame) -> tuple[np.ndarray, np.ndarray]:
    """The highest piece of a film over each place: its lower and upper end, `(n,)` um; NaN where there is none."""
    low, high = np.full(len(places), np.nan), np.full(len(places), np.nan)
    lines = shapely.linestrings([[(x, frame.bottom), (x, frame.top)] for x in places])
    for i, met in enumerate(shapely.intersection(polygon, lines)):
        pieces = [piece for piece in shapely.get_parts(met) if piece.length > 0]
        if pieces:
            ends = max(pieces, key=lambda piece: piece.bounds[3]).bounds
            low[i], high[i] = ends[1], ends[3]
    return low, high


def fallback(polygon: BaseGeometry) -> tuple[float, float]:
    """A point inside a film that no column meets, um."""
    point = polygon.representative_point()
    return float(point.x), float(point.y)


def spread(wanted: np.ndarray, widths: np.ndarray, low: float, high: float) -> np.ndarray:
    """Places for labels in their order, each near where it is wanted and none over another, points."""
    places = wanted.astype(float).copy()
    for _ in range(60):
        for i in range(len(places) - 1):
            over = 0.5 * (widths[i] + widths[i + 1]) - (places[i + 1] - places[i])
            if over > 0:
                places[i] -= 0.5 * over
                places[i + 1] += 0.5 * over
        places = np.clip(places, low + 0.5 * widths, high - 0.5 * widths)
    return places
