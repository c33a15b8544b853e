"""Polishing: everything above a level plane goes."""

from __future__ import annotations

from typing import Any

import numpy as np

from flowemu.errors import StepError
from flowemu.stack.measure import film_volume
from flowemu.stack.wafer import Cut, Loss, Wafer
from flowemu.steps.models.coating import surface_heights


def polish_to(wafer: Wafer, depth: float | None, to: str | None, tools: Any) -> Wafer:
    """The wafer with all above a plane removed: `depth` um below the highest point, or on top of film `to`."""
    stack, grid = wafer.stack, wafer.stack.grid
    if to is not None:
        k = stack.index(to)
        if k is None:
            raise StepError(f"there is no film '{to}' on the wafer")
        level = _top_of(stack, k)
    else:
        level = float(surface_heights(stack).max()) - float(depth or 0.0)
    above = np.ascontiguousarray(np.broadcast_to((grid.z - level).astype(np.float32)[:, None, None], grid.shape))
    after = stack.carve(dict.fromkeys(range(len(stack.films)), above))
    losses = []
    for film in stack.films:
        new = next((f for f in after.films if f.name == film.name and f.step == film.step), None)
        lost = film_volume(film, grid) - (film_volume(new, grid) if new is not None else 0.0)
        if lost > 1e-3:
            losses.append(Loss(film.name, film.material, 0.0, 0.0, 0.0, lost, True, new is None))
    return wafer.now(after, Cut(tools.step, "polish", "polish", 0.0, None, tuple(losses)))


def _top_of(stack: Any, k: int) -> float:
    """Height of a film's highest point, um."""
    t = stack.topology
    inside = (t.code == k).any(axis=(1, 2))
    edges = (t.interval_code == k).nonzero()[0]
    highest = -np.inf
    if inside.any():
        z = int(np.flatnonzero(inside)[-1])
        layer = t.on_grid(t.code)[z] == k
        film = stack.films[k]
        up = min(z + 1, stack.grid.nz - 1)
        a, b = film.top[z][layer], film.top[up][layer]
        span = stack.grid.z[up] - stack.grid.z[z]
        share = np.where(b > 0, a / np.where(b > a, a - b, -1.0), 1.0)
        highest = float((stack.grid.z[z] + share * span).max())
    inner = t.inner
    thin = (inner.code == k) & (inner.direction == 2)
    if thin.any():
        _, ny, nx = t.code.shape
        z = t.samples[inner.row[thin]] // (ny * nx)
        tops = stack.grid.z[z] + inner.high[thin] * (stack.grid.z[z + 1] - stack.grid.z[z])
        highest = max(highest, float(tops.max()))
    if not len(edges) or not np.isfinite(highest):
        raise StepError(f"film '{stack.films[k].name}' has no top on this wafer")
    return highest
