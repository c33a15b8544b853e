"""Directional etching: where a vertical beam gets to and when, column by column."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from flowemu.kernels import beam
from flowemu.stack.columns import column_edges, topmost
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.beam_cut import Strike, removed_film

FLAT = 1.10  # a column whose film is thicker than this times the usual is a wall, not the flat
CLEARED = 0.95  # share of the open flat that must be through for a film to be called cleared
EXPOSED = 0.90  # share of the open area over which an endpoint film must show


@dataclass(frozen=True, eq=False)
class Beam:
    """A beam from the front onto a stack.

    Attributes
    ----------
    rates : film number to um/s; films left out or at 0 stop the beam
    wall : degrees; the etched wall's angle to the horizontal, 90 is vertical
    """

    stack: FilmStack
    rates: Mapping[int, float]
    wall: float = 90.0

    @cached_property
    def slowness(self) -> np.ndarray:
        rates = np.array([self.rates.get(k, 0.0) for k in range(len(self.stack.films))])
        return np.where(rates > 0, 1.0 / np.where(rates > 0, rates, 1.0), np.inf)

    def _on_grid(self, array: np.ndarray) -> np.ndarray:
        _, ny, nx = self.stack.grid.shape
        return array[..., :ny, :nx]

    def through(self, films: list[int]) -> np.ndarray:
        """Time at each film's top and bottom (s) and its thickness (um) in each column, `(3, films, ny, nx)`.

        inf, inf and 0 where anything but these films lies above it.
        """
        slot = np.full(len(self.stack.films), -1)
        slot[films] = np.arange(len(films))
        return self._on_grid(beam.through_times(*column_edges(self.stack), self.slowness, slot, len(films)))

    def strike(self, time: float) -> Strike:
        """Where the beam is after `time` s."""
        floor, entry, stop, _, met = beam.strike(*column_edges(self.stack), self.slowness, time)
        etched = np.isfinite(self.slowness)[:, None, None]
        return Strike(time, floor, entry, stop, np.where((met < time) & etched, met, np.inf))

    def clear_time(self, films: list[int]) -> float:
        """When 95 % of the open flat of every listed film is gone, s; inf if a film is never met."""
        worst = 0.0
        for bottom, thick in zip(*self.through(films)[1:], strict=True):
            met = np.isfinite(bottom) & (thick > 0)
            if not met.any():
                return float("inf")
            flat = met & (thick <= FLAT * np.median(thick[met]))
            worst = max(worst, float(np.quantile(bottom[flat], CLEARED, method="higher")))
        return worst

    def expose_time(self, film: int) -> float:
        """When the film shows over 90 % of the area that no mask covers, s; inf if it never does."""
        etched = [k for k in range(len(self.stack.films)) if self.rates.get(k, 0) > 0 and k not in self.masks]
        top = self.through([film, *(k for k in etched if k != film)])[0, 0]
        first = topmost(self.stack)
        open_area = (first >= 0) & ~np.isin(first, list(self.masks - {film}))
        times = np.sort(top[open_area])
        if len(times) == 0:
            return float("inf")
        return float(times[min(int(np.ceil(EXPOSED * len(times))) - 1, len(times) - 1)])

    @cached_property
    def masks(self) -> frozenset[int]:
        """Films that serve as masks: resist, and what is not etched at all."""
        return frozenset(k for k, f in enumerate(self.stack.films) if f.name == "resist" or self.rates.get(k, 0) <= 0)

    def removed(self, time: float, strike: Strike | None = None) -> dict[int, np.ndarray]:
        """Removed field of each film that the beam meets within `time` s, `(nz, ny, nx)` float32 um."""
        if time <= 0:
            return {}
        hit = strike or self.strike(time)
        fields = {k: removed_film(self.stack, k, self.rates, hit, self.wall) for k in hit.first_times()}
        return {k: field for k, field in fields.items() if field is not None}
