"""What a loose part rested on, what took that away, and where its anchor should have been."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from flowemu.stack.wafer import Laid, Loosened, Printed


@dataclass(frozen=True)
class Lost:
    """Why a part has no anchor.

    `rested` is the film most of it rested on, `removed` the step that took it, `mask` and `printed` the
    mask whose openings lead through that film, `distance` (um) and `place` those of the nearest one.
    """

    film: str
    rested: str
    removed: int | None
    mask: str | None
    printed: int | None
    distance: float
    place: tuple[float, float] | None


def lost_anchor(view: Any, event: Loosened) -> Lost | None:
    """The missing anchor of an adrift part; None where what it rested on does not tell."""
    from flowemu.stack.wafer import Cut

    laid = _first_laid(view, event)
    if laid is None:
        return None
    under = laid.rests[event.columns]
    under = under[under >= 0]
    if len(under) == 0:
        return None
    rested = laid.names[int(np.bincount(under).argmax())]
    cuts = [e for e in view.events(Cut) if e.step <= event.step and any(loss.film == rested for loss in e.losses)]
    removed = cuts[-1].step if cuts else None
    opening = _nearest_opening(view, event, laid.step, rested)
    if opening is None:
        return Lost(laid.film, rested, removed, None, None, float("inf"), None)
    printed, distance, place = opening
    return Lost(laid.film, rested, removed, printed.mask, printed.step, distance, place)


def _first_laid(view: Any, event: Loosened) -> Laid | None:
    """When the oldest film of the part was put down."""
    from flowemu.stack.wafer import Laid

    laid = [e for e in view.events(Laid) if e.film in event.films]
    return min(laid, key=lambda e: e.step) if laid else None


def _nearest_opening(
    view: Any, event: Loosened, before: int, film: str
) -> tuple[Printed, float, tuple[float, float]] | None:
    """The printed mask through which `film` was cut whole, its distance from the part, and where it opens."""
    from flowemu.stack.wafer import Cut, Printed

    grid = view.wafer.stack.grid
    through = [
        cut for cut in view.events(Cut)
        if cut.step < before and cut.mask and any(loss.film == film and loss.through for loss in cut.losses)
    ]  # fmt: skip
    best = None
    for cut in through:
        printed = [p for p in view.events(Printed) if p.mask == cut.mask and p.step < cut.step][-1]
        away = -_at(printed.opened, event.outline, grid)
        k = int(np.argmin(away))
        distance, place = float(away[k]), _opening_place(printed.opened, event.outline[k], grid)
        if best is None or distance < best[1]:
            best = (printed, distance, place)
    return best


def _at(field: np.ndarray, points: np.ndarray, grid: Any) -> np.ndarray:
    """A planar field `(ny, nx)` between its samples at points `(n, 2)` um, `(n,)`."""
    from scipy.ndimage import map_coordinates

    y, x = (points[:, 1] - grid.y[0]) / grid.cell, (points[:, 0] - grid.x[0]) / grid.cell
    return np.asarray(map_coordinates(field.astype(float), [y, x], order=1, mode="nearest"))


def _opening_place(opened: np.ndarray, point: np.ndarray, grid: Any) -> tuple[float, float]:
    """The sample in an opening that is nearest to a point, um; the point itself if nothing is opened."""
    ys, xs = np.nonzero(opened > 0)
    if len(xs) == 0:
        return float(point[0]), float(point[1])
    k = int(np.argmin((grid.x[xs] - point[0]) ** 2 + (grid.y[ys] - point[1]) ** 2))
    return float(grid.x[xs[k]]), float(grid.y[ys[k]])
