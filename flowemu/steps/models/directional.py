"""Directional etching: what a vertical beam removes, film by film."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from flowemu.kernels import beam
from flowemu.stack.removed import complete
from flowemu.stack.stack import FilmStack

FLAT = 1.10  # a column whose film is thicker than this times the usual is a wall, not the flat
CLEARED = 0.95  # share of the open flat that must be through for a film to be called cleared
EXPOSED = 0.90  # share of the open area over which an endpoint film must show
MASKS = frozenset({"resist"})  # material classes that shield what is below them from "open area"


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

    def _edges(self) -> tuple[np.ndarray, ...]:
        t = self.stack.topology
        return t.code, t.row_of, t.count, t.start, t.interval_code, t.interval_end, self.stack.grid.z

    def _on_grid(self, array: np.ndarray) -> np.ndarray:
        _, ny, nx = self.stack.grid.shape
        return array[..., :ny, :nx]

    def through(self, film: int, passing: list[int]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Time at the film's top and bottom (s) and its thickness (um) in each column, `(ny, nx)`."""
        allowed = np.zeros(len(self.stack.films), np.uint8)
        allowed[passing] = 1
        out = self._on_grid(beam.through_times(*self._edges(), self.slowness, film, allowed))
        return out[0], out[1], out[2]

    def clear_time(self, films: list[int]) -> float:
        """When 95 % of the open flat of every listed film is gone, s; inf if a film is never met."""
        worst = 0.0
        for film in films:
            _, bottom, thick = self.through(film, [k for k in films if k != film])
            met = np.isfinite(bottom) & (thick > 0)
            if not met.any():
                return float("inf")
            flat = met & (thick <= FLAT * np.median(thick[met]))
            worst = max(worst, float(np.quantile(bottom[flat], CLEARED, method="higher")))
        return worst

    def expose_time(self, film: int) -> float:
        """When the film shows over 90 % of the area that no mask covers, s; inf if it never does."""
        etched = [k for k in range(len(self.stack.films)) if self.rates.get(k, 0) > 0 and k not in self.masks]
        above = [k for k in etched if k != film]
        top, _, _ = self.through(film, above)
        first = self._on_grid(beam.strike(*self._edges(), self.slowness, 0.0)[3])
        open_area = (first >= 0) & ~np.isin(first, list(self.masks))
        times = np.sort(top[open_area])
        if len(times) == 0:
            return float("inf")
        return float(times[min(int(np.ceil(EXPOSED * len(times))) - 1, len(times) - 1)])

    @cached_property
    def masks(self) -> frozenset[int]:
        """Films that serve as masks: resist, and what is not etched at all."""
        return frozenset(k for k, f in enumerate(self.stack.films) if f.name == "resist" or self.rates.get(k, 0) <= 0)

    def first_times(self, time: float) -> dict[int, float]:
        """When the beam first gets into each etched film, s; films not met within `time` are left out."""
        out = {}
        for k, rate in self.rates.items():
            if rate > 0:
                passing = [q for q in range(len(self.stack.films)) if q != k and self.rates.get(q, 0) > 0]
                first = float(self.through(k, passing)[0].min(initial=np.inf))
                if first < time:
                    out[k] = first
        return out

    def removed(self, time: float) -> dict[int, np.ndarray]:
        """Removed field of each etched film after `time` s, `(nz, ny, nx)` float32 um."""
        floor, entry, stop, _ = beam.strike(*self._edges(), self.slowness, time)
        struck = np.unique(stop[stop >= 0])
        out = {}
        for k, rate in self.rates.items():
            if rate > 0:
                field = self._removed_film(k, floor, entry, stop, struck)
                if field is not None:
                    out[k] = field
        return out

    def _removed_film(
        self, k: int, floor: np.ndarray, entry: np.ndarray, stop: np.ndarray, struck: np.ndarray
    ) -> np.ndarray | None:
        t = self.stack.topology
        sample = _film_samples(self.stack, k)
        if len(sample) == 0:
            return None
        _, ny, nx = t.code.shape
        column = sample % (ny * nx)
        place = self.stack.grid.z[sample // (ny * nx)]
        reached = place >= floor.reshape(-1)[column]
        if not reached.any():
            return None
        side = self._side_distance(k, struck)
        open_here = np.zeros(ny * nx, bool)
        open_here[column[reached]] = True
        ends = np.where(stop == k, floor, -np.inf)  # where it is cut through, only its walls end the cut
        floor_near, entry_near = _carry_sideways(open_here.reshape(ny, nx), ends, entry)
        lateral = np.full(len(sample), np.inf) if side is None else side.reshape(-1)[sample].astype(np.float64)
        shielded = np.isinf(lateral) & ~reached & ~open_here[column]
        lateral[shielded] = -0.5 * self.stack.grid.cell
        if self.wall != 90.0:
            angle = np.radians(self.wall)
            lateral = (lateral - (entry_near.reshape(-1)[column] - place) / np.tan(angle)) * np.sin(angle)
        below = place - floor_near.reshape(-1)[column]
        eroded = reached & (lateral < 0) if self.wall == 90.0 else np.zeros(len(sample), bool)
        lateral[eroded] = np.inf
        both = (below < 0) & (lateral < 0)
        value = np.where(both, -np.hypot(below, lateral), np.minimum(below, lateral))
        known = np.zeros(t.code.size, bool)
        known[sample] = True
        field = np.zeros(t.code.size, np.float32)
        band = self.stack.band
        field[sample] = np.clip(value, -band, band)
        return complete(self.stack, field, known)

    def _side_distance(self, k: int, struck: np.ndarray) -> np.ndarray | None:
        """Planar distance to the nearest wall of the masks above film `k`, positive in openings."""
        t = self.stack.topology
        f, shape = t.fields, t.code.shape
        side = None
        for q in struck:
            if q == k or f.gone[q] < 0:
                continue
            top = f.arrays[f.top[q]].reshape(shape)
            under = f.arrays[max(f.floor[q], 0)].reshape(shape)
            gone = f.arrays[f.gone[q]].reshape(shape)
            cast = beam.shadow(
                top, under, gone, bool(f.floor[q] >= 0), self.stack.grid.z, t.row_of, t.count, t.start,
                t.interval_code, t.interval_end, k,
            )  # fmt: skip
            side = cast if side is None else np.minimum(side, cast)
        return side


def _film_samples(stack: FilmStack, k: int) -> np.ndarray:
    """Flat numbers of the samples in film `k` and of those that have it on an edge of their column."""
    t = stack.topology
    code = t.code.reshape(-1)
    beside = beam.beside_in_column(t.samples, code, t.count, t.start, t.interval_code, t.strides[2], k)
    return np.flatnonzero(beside | (code == k))


def _carry_sideways(known: np.ndarray, *maps: np.ndarray) -> tuple[np.ndarray, ...]:
    """Maps over the columns with the unknown columns taking the nearest known one's value."""
    from scipy.ndimage import distance_transform_edt

    if known.all():
        return maps
    nearest = distance_transform_edt(~known, return_distances=False, return_indices=True)
    return tuple(m[tuple(nearest)] for m in maps)
