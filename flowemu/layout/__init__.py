"""Mask layouts: GDSII and OASIS files to merged polygons, and polygons to planar distance."""

from flowemu.layout.contours import merge
from flowemu.layout.layout import Layout, MissingCell, MissingLayer
from flowemu.layout.masks import FAR, Mask, mask_distance
from flowemu.layout.nearest import nearest
from flowemu.layout.offsets import ThinPlace, grow, round_corners, thin_places
from flowemu.layout.reading import read_layout

__all__ = [
    "FAR",
    "Layout",
    "Mask",
    "MissingCell",
    "MissingLayer",
    "ThinPlace",
    "grow",
    "mask_distance",
    "merge",
    "nearest",
    "read_layout",
    "round_corners",
    "thin_places",
]
