"""The film stack under a point of a finished run."""

from __future__ import annotations

from typing import Any

from flowemu.engine.run import Run
from flowemu.errors import RunError
from flowemu.stack.grid import Grid


def inside(grid: Grid, at: tuple[float, float]) -> None:
    """Raise a RunError unless a point, um, lies in the window."""
    x0, y0, x1, y1 = grid.box
    if not (x0 <= at[0] <= x1 and y0 <= at[1] <= y1):
        raise RunError(f"({at[0]:g}, {at[1]:g}) um lies outside the window [{x0:g}, {y0:g}, {x1:g}, {y1:g}] um")


def probe(run: Run, at: tuple[float, float]) -> dict[str, Any]:
    """Films under `at`, um, lowest first; heights from the wafer's front face.

    The wafer's own entry begins at minus its thickness; a gap between two entries is a void. Films on
    the back, which the grid does not reach, are `run.wafer.back`.
    """
    from flowemu.stack.columns import column

    stack = run.wafer.stack
    inside(stack.grid, at)
    bottom = -run.flow.wafer.thickness
    entries: list[dict[str, Any]] = []
    for layer in column(stack, *at):
        film = stack.films[layer.film]
        start = bottom if layer.film == 0 and not any(e["film"] == "wafer" for e in entries) else layer.low
        entries.append(_entry(film.name, film.material, start, layer.high))
    return {"at_um": [at[0], at[1]], "stack": entries}


def _entry(film: str, material: str, low: float, high: float) -> dict[str, Any]:
    return {"film": film, "material": material, "from_um": float(f"{low:.7g}"), "to_um": float(f"{high:.7g}")}
