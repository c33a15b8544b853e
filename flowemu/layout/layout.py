"""What a layout file holds, as far as it was asked for."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from flowemu.errors import LayoutError, near_miss

if TYPE_CHECKING:
    import numpy as np

    from flowemu.layout.masks import Mask

Pair = tuple[int, int]


class MissingCell(LayoutError):  # noqa: N818 - says what is wrong
    """The layout has no cell of the name asked for, or several top cells and none was named."""


class MissingLayer(LayoutError):  # noqa: N818
    """The chosen cell has no shape on the layer asked for."""


@dataclass(frozen=True, eq=False)
class Layout:
    """One cell of a layout file, flattened; lengths in um whatever the file's database unit.

    Attributes
    ----------
    path : Path
        The file that was read.
    sha256 : str
        Hash of the file's bytes.
    cells, top_cells : tuple of str
        Names of all cells in the file, and of those that no other cell refers to; sorted.
    cell : str
        The cell that was read.
    box : (x0, y0, x1, y1) or None, um
        Bounds of everything drawn in the cell; None for an empty one.
    layers : dict
        (layer, datatype) to the number of polygons drawn on it, before merging.
    loops : dict
        (layer, datatype) to its merged contour loops, for the layers that were asked for.
    texts : tuple
        Labels as (layer, texttype, text, x, y).
    """

    path: Path
    sha256: str
    cells: tuple[str, ...]
    top_cells: tuple[str, ...]
    cell: str
    box: tuple[float, float, float, float] | None
    layers: dict[Pair, int]
    loops: dict[Pair, list[np.ndarray]]
    texts: tuple[tuple[int, int, str, float, float], ...]

    def polygons(self, layer: int, datatype: int = 0) -> list[np.ndarray]:
        """Merged loops of a layer, `(n, 2)` float64 um each: outer ones counter-clockwise, holes clockwise.

        Raises
        ------
        MissingLayer
            Nothing is drawn there in this cell, or the layer was not asked for.
        """
        pair = (layer, datatype)
        fault = self.missing_layer(layer, datatype)
        if fault is not None:
            raise MissingLayer(fault)
        if pair not in self.loops:
            raise MissingLayer(f"layer {layer}/{datatype} was not read from '{self.path.name}'")
        return self.loops[pair]

    def mask(self, name: str, layer: int, datatype: int = 0) -> Mask:
        """The layer as a mask; raises as `polygons` does."""
        from flowemu.layout.masks import Mask

        return Mask(name, layer, datatype, tuple(self.polygons(layer, datatype)))

    def labels(self, layer: int, texttype: int = 0) -> list[tuple[str, float, float]]:
        """Labels of a layer as (text, x, y), um, in the file's order."""
        return [(text, x, y) for at, kind, text, x, y in self.texts if (at, kind) == (layer, texttype)]

    def missing_layer(self, layer: int, datatype: int = 0) -> str | None:
        """None if the layer has shapes in this cell, else a text that says what there is."""
        if (layer, datatype) in self.layers:
            return None
        if not self.layers:
            return f"layer {layer}/{datatype} is not in cell '{self.cell}', which is empty"
        return f"layer {layer}/{datatype} is not in cell '{self.cell}' of '{self.path.name}'; {self._near(layer)}"

    def _near(self, layer: int) -> str:
        there = "it has " + ", ".join(f"{a}/{b}" for a, b in sorted(self.layers)[:20])
        close = [f"{a}/{b}" for a, b in sorted(self.layers) if a == layer]
        return f"{there}; did you mean {close[0]}?" if close else there


def missing_cell(name: str | None, cells: list[str], tops: list[str], file: str) -> MissingCell:
    """The fault for a cell that is not in the file, or that has to be named: says which there are."""
    if name is None:
        return MissingCell(f"layout '{file}' has {len(tops)} top cells, so one must be named: {_some(tops)}")
    close = near_miss(name, cells)
    tail = f"; did you mean '{close}'?" if close else ""
    return MissingCell(f"layout '{file}' has no cell '{name}'; it has {_some(cells)}{tail}")


def _some(names: list[str]) -> str:
    return ", ".join(names[:12]) + (", ..." if len(names) > 12 else "")
