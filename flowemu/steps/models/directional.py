"""Directional etching: what a vertical beam removes, film by film."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

import numpy as np

from flowemu.kernels import beam, fronts
from flowemu.stack.removed import complete
from flowemu.stack.stack import FilmStack

FLAT = 1.10  # a column whose film is thicker than this times the usual is a wall, not the flat
CLEARED = 0.95  # share of the open flat that must be through for a film to be called cleared
EXPOSED = 0.90  # share of the open area over which an endpoint film must show
MASKS = frozenset({"resist"})  # material classes that shield what is below them from "open area"


class Strike(NamedTuple):
    """Where the beam ends in every column, `(ny, nx)`: its height, where it first met a solid, the film it stops in."""

    floor: np.ndarray
    entry: np.ndarray
    stop: np.ndarray


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
        if time <= 0:
            return {}
        strike = Strike(*beam.strike(*self._edges(), self.slowness, time)[:3])
        fields = ((k, self._removed_film(k, strike, time)) for k, rate in self.rates.items() if rate > 0)
        return {k: field for k, field in fields if field is not None}

    def _removed_film(self, k: int, strike: Strike, time: float) -> np.ndarray | None:
        t = self.stack.topology
        sample, flank = _film_samples(self.stack, k)
        _, ny, nx = t.code.shape
        column = sample % (ny * nx)
        place = self.stack.grid.z[sample // (ny * nx)]
        reached = place >= strike.floor.reshape(-1)[column]
        if not reached.any():
            return None
        below = self._depth_below(k, strike, time)[sample]
        lateral = self._wall_distance(k, strike, sample, reached)
        lateral = _beside(t.code.shape, sample, flank, lateral)
        both = (below < 0) & (lateral < 0)
        value = np.where(both, -np.hypot(below, lateral), np.minimum(below, lateral))
        known = np.zeros(t.code.size, bool)
        known[sample] = True
        field = np.zeros(t.code.size, np.float32)
        field[sample] = np.clip(value, -self.stack.band, self.stack.band)
        return complete(self.stack, field, known)

    def _depth_below(self, k: int, strike: Strike, time: float) -> np.ndarray:
        """Height above the etched floor of film `k`, flat over the samples, um; inf where it is cut through.

        The floor is the film's own surface moved down by its rate times the time left on reaching it,
        so it keeps walls and steps thinner than a cell.
        """
        from scipy.ndimage import maximum_filter

        t, band = self.stack.topology, self.stack.band
        f, shape = t.fields, t.code.shape
        passing = np.zeros(len(self.stack.films), np.uint8)
        passing[[q for q in range(len(passing)) if q != k and self.rates.get(q, 0) > 0]] = 1
        met = beam.through_times(*self._edges(), self.slowness, k, passing)[0]
        struck = met < time
        cut = struck & (strike.stop != k)
        partly = maximum_filter(struck & ~cut, size=5)
        depth = np.where(struck, self.rates[k] * (time - np.where(struck, met, time)), 0.0)
        depth, cut = _carry_sideways(struck, depth, cut & ~partly) if struck.any() else (depth, cut)
        top = f.arrays[f.top[k]].reshape(shape)
        if f.gone[k] >= 0:
            top = np.maximum(top, f.arrays[f.gone[k]].reshape(shape))
        below = beam.moved_down(top, depth, self.stack.grid.z)
        return np.where(np.broadcast_to(cut, shape), np.float32(band), below).reshape(-1)

    def _wall_distance(self, k: int, strike: Strike, sample: np.ndarray, reached: np.ndarray) -> np.ndarray:
        """Distance of samples from the walls that the masks above film `k` leave, um, positive in the opening."""
        t = self.stack.topology
        _, ny, nx = t.code.shape
        column = sample % (ny * nx)
        side = self._side_distance(k, np.unique(strike.stop[strike.stop >= 0]))
        open_here = np.zeros(ny * nx, bool)
        open_here[column[reached]] = True
        lateral = np.full(len(sample), np.inf) if side is None else side.reshape(-1)[sample].astype(np.float64)
        lateral[np.isinf(lateral) & ~reached & ~open_here[column]] = -0.5 * self.stack.grid.cell
        if self.wall != 90.0:
            place = self.stack.grid.z[sample // (ny * nx)]
            (entry,) = _carry_sideways(open_here.reshape(ny, nx), strike.entry)
            angle = np.radians(self.wall)
            return (lateral - (entry.reshape(-1)[column] - place) / np.tan(angle)) * np.sin(angle)
        lateral[reached & (lateral < 0)] = np.inf  # the mask above is gone there
        return lateral

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


def _film_samples(stack: FilmStack, k: int) -> tuple[np.ndarray, np.ndarray]:
    """Flat numbers of the samples in film `k` or with it on an axis edge; which only flank it from another solid."""
    t = stack.topology
    code = t.code.reshape(-1)
    given = t.samples, code, t.count, t.start, t.interval_code, t.strides, k
    mine = code == k
    upright = beam.beside_film(*given, 2, 3) | mine
    sample = np.flatnonzero(beam.beside_film(*given, 0, 2) | upright)
    return sample, ~upright[sample] & (code[sample] >= 0)


def _beside(shape: tuple[int, ...], sample: np.ndarray, flank: np.ndarray, lateral: np.ndarray) -> np.ndarray:
    """Distances from walls with those of flanking samples taken from their neighbours, inf where those have none.

    A sample in the step that a film covers lies in what would shadow it.
    """
    value = np.zeros(int(np.prod(shape)), np.float32)
    known = np.zeros(len(value), bool)
    value[sample] = np.minimum(lateral, 1e6)
    known[sample[~flank]] = True
    want = np.zeros(len(value), bool)
    want[sample[flank]] = True
    value, known = fronts.spread_once(value.reshape(shape), known.reshape(shape), want.reshape(shape))
    out = lateral.copy()
    out[flank] = np.where(known.reshape(-1)[sample[flank]], value.reshape(-1)[sample[flank]], np.inf)
    return out


def _carry_sideways(known: np.ndarray, *maps: np.ndarray) -> tuple[np.ndarray, ...]:
    """Maps over the columns with the unknown columns taking the nearest known one's value."""
    from scipy.ndimage import distance_transform_edt

    if known.all():
        return maps
    nearest = distance_transform_edt(~known, return_distances=False, return_indices=True)
    return tuple(m[tuple(nearest)] for m in maps)
