"""Masks, and the planar distance to what is drawn on them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowemu.layout.contours import segments_of
from flowemu.layout.offsets import grow, round_corners

FAR = 1e6
"""Distance in um that stands for "nothing is drawn anywhere"."""


@dataclass(frozen=True, eq=False)
class Mask:
    """One mask of a flow.

    Attributes
    ----------
    name : str
        Its name in the flow.
    layer, datatype : int
        Where it is drawn.
    loops : tuple of (n, 2) float64, um
        Merged contours: outer ones counter-clockwise, holes clockwise.
    """

    name: str
    layer: int
    datatype: int
    loops: tuple[np.ndarray, ...]


def mask_distance(
    loops: Sequence[np.ndarray],
    x: np.ndarray,
    y: np.ndarray,
    bias: float = 0.0,
    shift: tuple[float, float] = (0.0, 0.0),
    rounding: float = 0.0,
) -> np.ndarray:
    """Signed distance in the plane to the edge of the drawn area, negative inside it.

    What is drawn beyond the samples counts. Corners are rounded first, then every edge moves out by
    the bias, then the whole is shifted; the result is the exact distance to that last shape.

    Parameters
    ----------
    loops : sequence of (n, 2) float64, um
        Merged contours, as `merge` or `Layout.polygons` return them.
    x, y : (nx,), (ny,) float, um
        Rising sample places.
    bias : float, um
        Outward move of each edge; outer corners come out round. Negative: inward.
    shift : (dx, dy), um
        Move of the whole mask.
    rounding : float, um
        Radius that no corner falls below.

    Returns
    -------
    (ny, nx) float32, um
        Within 1e-5 um near the edge for straight ones, 2e-3 um for arcs made by bias or rounding;
        `FAR` everywhere where nothing is drawn.

    Raises
    ------
    LayoutError
        The rounding would erase a drawn line.
    """
    from flowemu.kernels.polygon import signed_distance

    shaped = grow(round_corners(loops, rounding), bias)
    if not shaped:
        return np.full((len(y), len(x)), FAR, dtype=np.float32)
    segments = segments_of(shaped) + np.tile(np.asarray(shift, dtype=float), 2)
    return signed_distance(segments, np.asarray(x, dtype=float), np.asarray(y, dtype=float))
