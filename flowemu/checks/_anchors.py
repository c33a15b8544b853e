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
        away = np.where(event.columns, -printed.opened, np.inf)
        iy, ix = (int(i) for i in np.unravel_index(int(np.argmin(away)), away.shape))
        distance = float(away[iy, ix])
        place = _opening_place(printed.opened, iy, ix, grid)
        if best is None or distance < best[1]:
            best = (printed, distance, place)
    return best


def _opening_place(opened: np.ndarray, iy: int, ix: int, grid: Any) -> tuple[float, float]:
    """The nearest place that is opened, from the sample at (iy, ix), um."""
    ys, xs = np.nonzero(opened > 0)
    if len(xs) == 0:
        return float(grid.x[ix]), float(grid.y[iy])
    k = int(np.argmin((xs - ix) ** 2 + (ys - iy) ** 2))
    return float(grid.x[xs[k]]), float(grid.y[ys[k]])
