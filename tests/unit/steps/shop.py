"""Steps carried out by hand: real settings, process data and mask distances, no flow file and no layout file."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from types import SimpleNamespace
from typing import Any

import numpy as np

from flowemu.engine.tools import Tools
from flowemu.flow.process import ProcessData, load_process_data
from flowemu.registry import step_kinds
from flowemu.stack.film import Film
from flowemu.stack.grid import Grid
from flowemu.stack.wafer import Cut, Wafer
from flowemu.steps.models.coating import coat
from tests import stacks

Loops = list[np.ndarray]


@cache
def process_data() -> ProcessData:
    return load_process_data(None)


def box(x0: float, x1: float, y0: float = -50.0, y1: float = 50.0) -> np.ndarray:
    """Corners of a drawn box, um."""
    return np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]])


def tools(
    verb: str, step: int = 9, places: Mapping[str, Any] | None = None, masks: Mapping[str, Loops] | None = None,
    grid: Grid | None = None,
) -> Tools:  # fmt: skip
    """Tools of one step; places as `{name: (film, (x, y))}`, masks as `{name: polygons}`."""
    drawn = list((masks or {}).items())
    flow = SimpleNamespace(masks={name: (number, 0) for number, (name, _) in enumerate(drawn)})
    layout = SimpleNamespace(polygons=lambda layer, datatype: drawn[layer][1])
    return Tools(flow, process_data(), layout, places or {}, grid, step, verb)  # type: ignore[arg-type]


def do(
    wafer: Wafer, verb: str, step: int = 9, places: Mapping[str, Any] | None = None,
    masks: Mapping[str, Loops] | None = None, **settings: Any,
) -> Wafer:  # fmt: skip
    """The wafer after a step; `with_` stands for `with`."""
    kind = step_kinds()[verb]
    given = {"with" if name == "with_" else name: value for name, value in settings.items()}
    with_tools = tools(verb, step, places, masks, wafer.stack.grid)
    after: Wafer = kind.apply(wafer, kind.settings.model_validate(given), with_tools)
    return after


def layered(*films: tuple[str, str, str | None, float], nx: int = 12, ny: int = 1, height: float = 0.2) -> Wafer:
    """A wafer under films of (name, material, state, thickness), each put down by a step of its own."""
    stack = stacks.bare(stacks.even_grid(nx, -4, 14, ny=ny), height)
    for k, (name, material, state, thickness) in enumerate(films):
        stack = coat(stack, Film(name, material, state, k + 1, stack.surface), thickness)
    return Wafer(stack)


def cut_of(wafer: Wafer) -> Cut:
    """The last record of something being taken away."""
    return [event for event in wafer.events if isinstance(event, Cut)][-1]


def same_fields(a: Wafer, b: Wafer) -> bool:
    """Whether two wafers hold the very same fields, by identity."""
    return a.stack.surface is b.stack.surface and all(
        all(getattr(f, name) is getattr(g, name) for name in ("top", "floor", "gone"))
        for f, g in zip(a.stack.films, b.stack.films, strict=True)
    )
