"""Mask layouts: GDSII and OASIS files to merged polygons, and polygons to planar distance."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from flowemu.layout.contours import merge
    from flowemu.layout.layout import Layout, MissingCell, MissingLayer
    from flowemu.layout.masks import FAR, Mask, mask_distance
    from flowemu.layout.offsets import ThinPlace, grow, round_corners, thin_places
    from flowemu.layout.reading import read_layout

_PUBLIC = {
    "FAR": "masks",
    "Layout": "layout",
    "Mask": "masks",
    "MissingCell": "layout",
    "MissingLayer": "layout",
    "ThinPlace": "offsets",
    "grow": "offsets",
    "mask_distance": "masks",
    "merge": "contours",
    "read_layout": "reading",
    "round_corners": "offsets",
    "thin_places": "offsets",
}
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
    "read_layout",
    "round_corners",
    "thin_places",
]


def __getattr__(name: str) -> Any:
    """The public names, imported when they are first asked for: a lint needs no polygons and no numpy."""
    if name in _PUBLIC:
        return getattr(import_module(f"{__name__}.{_PUBLIC[name]}"), name)
    raise AttributeError(f"module '{__name__}' has no attribute '{name}'")
