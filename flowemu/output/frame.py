"""What part of a section a figure shows, and at which scales."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from shapely.geometry.base import BaseGeometry

from flowemu.output.section import Section

STRETCHES = (1, 2, 3, 4, 5, 8, 10, 15, 20, 30, 50, 80, 100)
WIDTH_IN = 8.2
LOW_IN = 2.3
HIGH_IN = 5.4
CM_PER_IN = 2.54
ROUND_STEPS = (1.0, 2.0, 5.0, 10.0)


@dataclass(frozen=True)
class Frame:
    """The shown heights, the drawing's size on paper, and how far the heights are stretched.

    Attributes
    ----------
    bottom, top : float, um
    length : float, um
    stretch : int
        Vertical scale over horizontal scale.
    width_in, height_in : float, inch
    """

    bottom: float
    top: float
    length: float
    stretch: int
    width_in: float
    height_in: float

    @property
    def points_per_um(self) -> tuple[float, float]:
        """Printer's points to one um along and up."""
        return 72.0 * self.width_in / self.length, 72.0 * self.height_in / (self.top - self.bottom)

    def scales(self) -> str:
        """Both scales in words."""
        along = self.length / (self.width_in * CM_PER_IN)
        if self.stretch == 1:
            return f"equal axes: 1 cm is {along:.3g} µm along and up"
        return f"vertical ×{self.stretch}: 1 cm is {along:.3g} µm along, {along / self.stretch:.3g} µm up"


def frame_of(section: Section, stretch: int | None = None) -> Frame:
    """Crop the bulk wafer and choose a vertical stretch at which the films can be told apart."""
    bottom, top = shown_heights(section)
    tall = WIDTH_IN * (top - bottom) / section.length
    if stretch is None:
        fitting = [s for s in STRETCHES if tall * s <= HIGH_IN] or [1]
        stretch = next((s for s in fitting if tall * s >= LOW_IN), fitting[-1])
    width = min(WIDTH_IN, WIDTH_IN * HIGH_IN / (tall * stretch))
    height = width * (top - bottom) * stretch / section.length
    return Frame(bottom, top, section.length, stretch, width, height)


def shown_heights(section: Section) -> tuple[float, float]:
    """Heights from a little below the lowest film or pit to a little above the highest film, um."""
    solids = [polygon for _, polygon in section.films if not polygon.is_empty]
    if not solids:
        return section.bottom, section.top
    wafer, *others = solids
    low, high = wafer_surface(section, wafer)
    low = min([low] + [polygon.bounds[1] for polygon in others])
    high = max([high] + [polygon.bounds[3] for polygon in others])
    span = max(high - low, section.length / 100.0)
    return max(section.bottom, low - max(0.22 * span, 0.008 * section.length)), min(section.top, high + 0.1 * span)


def wafer_surface(section: Section, wafer: BaseGeometry) -> tuple[float, float]:
    """The lowest and highest point of the wafer's surface above the modelled bottom, um."""
    edge = 1e-3 * section.cell
    heights = np.concatenate([np.asarray(ring.coords)[:, 1] for ring in rings_of(wafer)])
    surface = heights[heights > section.bottom + edge]
    if not len(surface) or through_wafer(section, wafer):
        return wafer.bounds[1], wafer.bounds[3]
    return float(surface.min()), float(surface.max())


def through_wafer(section: Section, wafer: BaseGeometry) -> bool:
    """Whether anything but the wafer reaches the modelled bottom."""
    import shapely

    strip = shapely.box(0.0, section.bottom, section.length, section.bottom + 0.1 * section.cell)
    return bool(shapely.difference(strip, wafer).area > 0.01 * strip.area)


def rings_of(geometry: BaseGeometry) -> list[BaseGeometry]:
    """All rings of a polygon or of many."""
    import shapely

    return [ring for part in shapely.get_parts(geometry) for ring in (part.exterior, *part.interiors)]


def round_length(most: float) -> float:
    """The largest of 1, 2, 5 times a power of ten that is no longer than `most`, um."""
    decade = 10.0 ** np.floor(np.log10(most))
    return float(max(step * decade for step in ROUND_STEPS if step * decade <= most * (1 + 1e-9)))
