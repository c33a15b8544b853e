"""What a flow says of its layout, held against what the layout file holds."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from typing import Any, Protocol, TypeVar

from flowemu.errors import Fault, InputError, LayoutError, hint
from flowemu.flow.flow import Flow

Box = tuple[float, float, float, float]
_SLACK = 1e-9


class Drawn(Protocol):
    """The part of a layout that is looked at; `layout.Layout` has it."""

    @property
    def cell(self) -> str: ...
    @property
    def box(self) -> Box | None: ...
    def missing_layer(self, layer: int, datatype: int = 0) -> str | None: ...
    def labels(self, layer: int, texttype: int = 0) -> list[tuple[str, float, float]]: ...


D = TypeVar("D", bound=Drawn)


def read_drawn(
    flow: Flow, reader: Callable[..., D], missing_cell: type[LayoutError], wanted: Iterable[Any] | None = None
) -> D:
    """The flow's layout, read by `reader(path, cell, wanted)` and found to hold what the flow says of it.

    Parameters
    ----------
    reader : callable
        `layout.read_layout`, handed in because the flow knows no layout files.
    missing_cell : type
        The error by which `reader` says that the cell, not the file, is at fault.
    wanted : iterable of (layer, datatype) or None
        Layers whose polygons are needed; those of all masks if left out.

    Raises
    ------
    InputError
        With every fault, placed in the flow file.
    """
    pairs = flow.masks.values() if wanted is None else wanted
    try:
        drawn = reader(flow.layout_path, flow.layout.cell, pairs)
    except LayoutError as error:
        setting = "cell" if isinstance(error, missing_cell) else "file"
        raise InputError([flow.fault(("layout", setting), f"layout.{setting}: {error}")]) from None
    faults = drawn_faults(flow, drawn)
    if faults:
        raise InputError(faults)
    return drawn


def drawn_faults(flow: Flow, drawn: Drawn) -> list[Fault]:
    """Every fault of the masks, the window, the places and the parts' names."""
    return [*_layers(flow, drawn), *_window(flow, drawn), *_places(flow, drawn), *_part_names(flow, drawn)]


def window_box(flow: Flow, drawn: Drawn) -> Box | None:
    """The window as the flow states it, else the cell's box, um; None where neither is there."""
    return flow.layout.window.box if flow.layout.window else drawn.box


def part_names(flow: Flow, drawn: Drawn) -> list[str]:
    """All names of parts, those of `parts:` first, then the layout's labels."""
    labels = drawn.labels(*flow.layout.labels) if flow.layout.labels else []
    return list(dict.fromkeys([*flow.parts, *(text for text, _, _ in labels)]))


def _layers(flow: Flow, drawn: Drawn) -> Iterator[Fault]:
    for name, (layer, datatype) in flow.masks.items():
        text = drawn.missing_layer(layer, datatype)
        if text is not None:
            yield flow.fault(("layout", "masks", name), f"layout.masks.{name}: {text}")


def _window(flow: Flow, drawn: Drawn) -> Iterator[Fault]:
    box, where = drawn.box, ("layout", "window")
    if box is None:
        yield flow.fault(("layout", "cell"), f"layout.cell: cell '{drawn.cell}' is empty")
        return
    spelled = "[" + ", ".join(f"{value:g} um" for value in box) + "]"
    left, bottom, right, top = window_box(flow, drawn) or box
    if flow.layout.window and (left >= box[2] or right <= box[0] or bottom >= box[3] or top <= box[1]):
        text = f"layout.window: it lies outside cell '{drawn.cell}', whose box is {spelled}"
        yield flow.fault(where, text)
    least, cell = min(right - left, top - bottom), flow.grid.cell
    if not flow.layout.window and least < cell * (1.0 - _SLACK):
        text = f"layout.cell: cell '{drawn.cell}' with its box {spelled} is smaller than the grid's cell of {cell:g} um"
        yield flow.fault(("layout", "cell"), text)


def _places(flow: Flow, drawn: Drawn) -> Iterator[Fault]:
    box = window_box(flow, drawn)
    places: list[tuple[tuple[str | int, ...], tuple[float, float]]] = [
        (("parts", name, "at"), part.at) for name, part in flow.parts.items()
    ]
    for index, expectation in enumerate(flow.expect):
        if expectation.thickness is not None:
            places.append((("expect", index, "thickness", "at"), expectation.thickness.at))
    for path, (x, y) in places:
        if box is not None and not (box[0] <= x <= box[2] and box[1] <= y <= box[3]):
            yield flow.fault(path, f"{flow.document.name_of(path)}: ({x:g}, {y:g}) um lies outside the window")


def _part_names(flow: Flow, drawn: Drawn) -> Iterator[Fault]:
    known = part_names(flow, drawn)
    for path, name in _named_parts(flow):
        if name not in known:
            text = f"there is no part '{name}' under parts or among the labels{hint(name, known, 'named are')}"
            yield flow.fault(path, f"{flow.document.name_of(path)}: {text}")


def _named_parts(flow: Flow) -> Iterator[tuple[tuple[str | int, ...], str]]:
    """Every place in the flow that speaks of a part."""
    for step in flow.steps:
        for name in getattr(step.settings, "frees", None) or ():
            yield (*step.where, "frees"), name
    for index, expectation in enumerate(flow.expect):
        if expectation.kind != "thickness":
            yield ("expect", index, expectation.kind, "part"), expectation.subject.part
