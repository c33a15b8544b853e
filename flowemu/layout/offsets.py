"""Moving the edges of drawn areas: bias, corner rounding, and where lines or spaces are too thin."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Literal, NamedTuple

import numpy as np

from flowemu.errors import LayoutError
from flowemu.layout.contours import Loops, as_polygons, outlines, precision_for

ARC_ERROR = 5e-4
"""Greatest distance in um between a rounded corner and the polygon that stands for it."""
MITER_LIMIT = 2
"""Corners sharper than 60 degrees count as thin."""
THINNEST_SLIVER = 1e-4
"""Leftovers narrower than this many um are rounding, not thin places."""
CORNER_SHARE = 0.2
"""A leftover nowhere thicker than this share of the width it stands for is a clipped corner, not a line."""


class ThinPlace(NamedTuple):
    """A drawn line or space that is narrower than asked: where, how wide in um, and which of the two."""

    x: float
    y: float
    width: float
    kind: str


def grow(loops: Sequence[np.ndarray], distance: float) -> Loops:
    """Move every edge outward by `distance` um, corners rounded; negative moves it inward."""
    if distance == 0.0 or not loops:
        return list(loops)
    step = precision_for(loops)
    moved = _moved(as_polygons(loops, step), distance, step, "round")
    return outlines([polygon.points for polygon in moved], step)


def round_corners(loops: Sequence[np.ndarray], radius: float) -> Loops:
    """Round outer and inner corners to at least `radius` um.

    Raises
    ------
    LayoutError
        A line or a space narrower than twice the radius would be lost; the text says where.
    """
    if radius == 0.0 or not loops:
        return list(loops)
    lost = thin_places(loops, 2.0 * radius)
    if lost:
        x, y, width, kind = lost[0]
        raise LayoutError(
            f"corner rounding of {radius:g} um would erase a drawn {kind} {width:.3g} um wide at ({x:g}, {y:g}) um"
        )
    step = precision_for(loops)
    region = as_polygons(loops, step)
    for distance in (-radius, 2.0 * radius, -radius):
        region = _moved(region, distance, step, "round")
    return outlines([polygon.points for polygon in region], step)


def thin_places(loops: Sequence[np.ndarray], width: float, most: int = 20) -> list[ThinPlace]:
    """Places where a drawn line, or the space between drawn lines, is narrower than `width`.

    Parameters
    ----------
    loops : sequence of (n, 2) float64, um
        Merged contours.
    width : float, um
        The least width that will do.
    most : int
        At most so many places are returned.

    Returns
    -------
    list of ThinPlace
        Narrowest first, widths within 3 % of `width`; corners as such do not count, unless they are
        sharper than 60 degrees.
    """
    if width <= 0.0 or not loops:
        return []
    step = precision_for(loops)
    region = as_polygons(loops, step)
    places = []
    for kind in ("line", "space"):
        for piece in _thin_pieces(region, width, kind, step):
            near = _around(region, piece, 2.0 * width, step)
            place = _narrowest(near, piece, width, kind, step)
            if _moved([piece], -0.5 * CORNER_SHARE * place.width, step, "miter"):
                places.append(place)
    return sorted(places, key=lambda place: (place.width, place.x, place.y))[:most]


def _moved(region: list[Any], distance: float, step: float, join: Literal["miter", "round"]) -> list[Any]:
    """The region with its edges moved outward by `distance`, or inward if negative."""
    import gdstk

    if join == "miter":
        return gdstk.offset(region, distance, join, MITER_LIMIT, step, True)
    if distance < 0.0:
        return _shrunk(region, -distance, step)
    sides = math.ceil(math.pi / math.acos(1.0 - min(0.5, ARC_ERROR / distance)))
    return gdstk.offset(region, distance, join, max(32, sides), step, True)


def _shrunk(region: list[Any], distance: float, step: float) -> list[Any]:
    """What is left when all around the region grows: the library resolves arcs sensibly only in growing."""
    import gdstk

    if not region:
        return []
    boxes = [piece.bounding_box() for piece in region]
    low = np.min([box[0] for box in boxes], axis=0) - 2.0 * distance
    high = np.max([box[1] for box in boxes], axis=0) + 2.0 * distance
    frame = gdstk.rectangle(tuple(low), tuple(high))
    around = gdstk.boolean(frame, region, "not", precision=step)
    return gdstk.boolean(frame, _moved(around, distance, step, "round"), "not", precision=step)


def _thin_pieces(region: list[Any], width: float, kind: str, step: float) -> list[Any]:
    """What is lost when the region is thinned by half the width and restored, or the other way round."""
    import gdstk

    half = 0.5 * width * (1.0 if kind == "space" else -1.0)
    restored = _moved(_moved(region, half, step, "miter"), -half, step, "miter")
    pair = (restored, region) if kind == "space" else (region, restored)
    pieces = gdstk.boolean(*pair, "not", precision=step)
    return [piece for piece in pieces if piece.area() > THINNEST_SLIVER * max(width, piece.perimeter())]


def _around(region: list[Any], piece: Any, margin: float, step: float) -> list[Any]:
    """The part of the region near a piece."""
    import gdstk

    (x0, y0), (x1, y1) = piece.bounding_box()
    frame = gdstk.rectangle((x0 - margin, y0 - margin), (x1 + margin, y1 + margin))
    return gdstk.boolean(region, frame, "and", precision=step)


def _narrowest(region: list[Any], piece: Any, width: float, kind: str, step: float) -> ThinPlace:
    """The least width within a piece by bisection, and the middle of where it is."""
    import gdstk

    low, high, found = 0.0, width, [piece]
    while high - low > 0.02 * width:
        middle = 0.5 * (low + high)
        inside = gdstk.boolean(_thin_pieces(region, middle, kind, step), piece, "and", precision=step)
        if inside:
            high, found = middle, inside
        else:
            low = middle
    (x0, y0), (x1, y1) = found[0].bounding_box()
    return ThinPlace(0.5 * float(x0 + x1), 0.5 * float(y0 + y1), 0.5 * (low + high), kind)
