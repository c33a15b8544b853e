"""The grid of a run: the window in whole cells, and z planes from a dry run of the flow's heights."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from flowemu.errors import InputError
from flowemu.flow.flow import Flow
from flowemu.stack.grid import MAX_SPACING_RATIO, Grid

MARGIN = 3.0  # um below the deepest reach that is modelled if the flow does not say how much
ABOVE = 5  # cells of open space above everything
GROWTH = 1.2  # ratio of neighbouring cells where the planes widen
WIDEST = 4.0  # cells: the coarsest a plane spacing gets


@dataclass(frozen=True)
class Profile:
    """Heights that a flow's steps can reach, um: the deepest cut, the highest film, the highest resist."""

    low: float = 0.0
    high: float = 0.0
    peak: float = 0.0

    def raised(self, thickness: float) -> Profile:
        """After a film everywhere."""
        high = self.high + thickness
        return replace(self, high=high, peak=max(self.peak, high))

    def covered(self, thickness: float) -> Profile:
        """Under a coat of resist."""
        return replace(self, peak=max(self.peak, self.high + thickness))

    def cut(self, settings: Any, tools: Any) -> Profile:
        """After an etch: how deep it can go into the bare wafer."""
        wafer = tools.wafer_rate(settings)
        if not wafer:
            return self
        how, value = settings.stated_amount()
        if how == "depth":
            deep = float(value)
        elif how == "time":
            deep = wafer * float(value)
        else:
            slowest = tools.slowest_rate(settings)
            deep = (self.high - self.low) * settings.over * wafer / slowest if slowest else 0.0
        return replace(self, low=self.low - deep)


def make_grid(flow: Flow, box: tuple[float, float, float, float], cell: float, tools: Any) -> tuple[Grid, list[str]]:
    """The grid of a run and what was changed about the window, in words."""
    left, bottom, right, top = box
    nx, ny = _whole(right - left, cell), _whole(top - bottom, cell)
    if min(nx, ny) < 1 or min(right - left, top - bottom) < cell * (1 - 1e-6):
        text = f"the window of {right - left:g} x {top - bottom:g} um is smaller than the grid's cell of {cell:g} um"
        raise InputError([flow.fault(("layout", "window"), f"layout.window: {text}")])
    said = []
    if nx * cell > right - left + 1e-6 or ny * cell > top - bottom + 1e-6:
        said.append(f"the window grew outward to whole cells, {nx * cell:g} x {ny * cell:g} um")
    x0 = 0.5 * (left + right) - 0.5 * nx * cell
    y0 = 0.5 * (bottom + top) - 0.5 * ny * cell
    if flow.grid.planes is not None:
        planes = np.array(flow.grid.planes, float)
        _check_planes(flow, planes)
    else:
        planes = dry_run_planes(flow, cell, tools)
    return Grid(x0, y0, cell, nx, ny, planes), said


def _whole(length: float, cell: float) -> int:
    return math.ceil(length / cell - 1e-6)


def _check_planes(flow: Flow, planes: np.ndarray) -> None:
    gaps = np.diff(planes)
    where = ("grid", "planes")
    if len(planes) < 3 or (gaps <= 0).any():
        raise InputError([flow.fault(where, "grid.planes: expected at least three heights, each above the one before")])
    ratio = np.maximum(gaps[1:] / gaps[:-1], gaps[:-1] / gaps[1:])
    if (ratio > MAX_SPACING_RATIO + 1e-9).any():
        k = int(np.argmax(ratio))
        text = f"neighbour spacings {gaps[k]:g} um and {gaps[k + 1]:g} um differ by more than a factor"
        raise InputError([flow.fault(where, f"grid.planes: {text} {MAX_SPACING_RATIO}")])


def dry_run_planes(flow: Flow, cell: float, tools: Any) -> np.ndarray:
    """Planes one cell apart where films can be, wider in the wafer below and in the open space above."""
    profile = Profile()
    for step in flow.steps:
        profile = step.kind.heights(profile, step.settings, tools)
    bottom = -flow.wafer.depth if flow.wafer.depth is not None else profile.low - MARGIN
    bottom = min(bottom, -3 * cell)
    fine_low = max(profile.low - 2 * cell, bottom)
    fine_low = -math.ceil(-fine_low / cell - 1e-6) * cell
    fine_high = math.ceil((profile.high + 2 * cell) / cell - 1e-6) * cell
    middle = fine_low + cell * np.arange(round((fine_high - fine_low) / cell) + 1)
    top = max(profile.peak, profile.high) + ABOVE * cell
    up = _widening(cell, top - fine_high)
    down = _widening(cell, fine_low - bottom)
    return np.concatenate([(fine_low - np.cumsum(down))[::-1], middle, fine_high + np.cumsum(up)])


def _widening(cell: float, length: float) -> np.ndarray:
    """Spacings that grow from `cell` and sum up to at least `length` um."""
    steps: list[float] = []
    while sum(steps) < length - 1e-9:
        steps.append(min((steps[-1] if steps else cell) * GROWTH, WIDEST * cell))
    return np.array(steps)
