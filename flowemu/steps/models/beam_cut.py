"""What a vertical beam takes from one film: down to a floor, out to the walls that the masks above leave."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from flowemu.kernels import shadow
from flowemu.stack.film import BAND
from flowemu.stack.removed import RINGS, complete
from flowemu.stack.stack import FilmStack

MARGIN = int(BAND) + RINGS + 2  # cells about what the beam reaches in which a film's removed field is worked out


class Strike(NamedTuple):
    """Where the beam is after `time` s, in every column of the topology's samples.

    Attributes
    ----------
    floor, entry : (ny, nx) float64, um; heights at which it is and at which it first met a solid
    stop : (ny, nx) int32; the film it is in or stopped at, -1 if none
    met : (films, ny, nx) float64, s; when it got to each film that it etches, inf if it did not
    """

    time: float
    floor: np.ndarray
    entry: np.ndarray
    stop: np.ndarray
    met: np.ndarray

    def first_times(self) -> dict[int, float]:
        """When the beam first gets into each film that it meets in time, s."""
        first = self.met.min(axis=(1, 2))
        return {int(k): float(first[k]) for k in np.flatnonzero(first < self.time)}


class Box(NamedTuple):
    """Where a film is worked on: the box of samples, their marks, and all columns with one that the beam passed."""

    place: tuple[slice, slice, slice]
    mark: np.ndarray
    passed: np.ndarray

    @property
    def columns(self) -> tuple[slice, slice]:
        return self.place[1:]

    @property
    def corner(self) -> tuple[int, int, int]:
        return self.place[0].start, self.place[1].start, self.place[2].start


def removed_film(
    stack: FilmStack, k: int, rates: Mapping[int, float], strike: Strike, wall: float
) -> np.ndarray | None:
    """Removed field of film `k`, which the beam meets, `(nz, ny, nx)` float32 um; None if it takes nothing."""
    box = _box_near_beam(stack, k, strike)
    if box is None:
        return None
    depth, cut = _depths(k, rates[k], strike)
    value = _values(stack, k, strike, wall, box, depth, cut)
    if not (value < 0).any():  # all goes that is near; what is farther off must be seen to stay
        box = _whole_box(stack, k, strike)
        value = _values(stack, k, strike, wall, box, depth, cut)
    field, known = np.zeros(stack.topology.code.shape, np.float32), np.zeros(stack.topology.code.shape, bool)
    field[box.place], known[box.place] = value, box.mark > 0
    return complete(stack, field, known)


def _values(
    stack: FilmStack, k: int, strike: Strike, wall: float, box: Box, depth: np.ndarray, cut: np.ndarray
) -> np.ndarray:
    """Removed field of film `k` at the marked samples of the box, 0 at the others, float32 um."""
    lateral = _wall_distance(stack, k, strike, box, wall)
    shielded = (box.mark == shadow.HELD).any(axis=0) & ~np.isfinite(strike.met[k][box.columns])
    below = _height_above_floor(stack, k, box, depth[box.columns], lateral, shielded)
    return np.asarray(shadow.removed_values(box.mark, below, lateral, cut[box.columns], shielded, stack.band))


def _marked(stack: FilmStack, k: int, low: int) -> np.ndarray:
    """What every sample from plane `low` up is to film `k` (see `kernels.shadow`), `(nz - low, ny, nx)` uint8."""
    t = stack.topology
    nz, ny, nx = t.code.shape
    plane_start = np.searchsorted(t.samples, np.arange(nz + 1) * (ny * nx))
    return np.asarray(shadow.mark_film(t.samples, plane_start, t.code, t.count, t.start, t.interval_code, k, low))


def _whole_box(stack: FilmStack, k: int, strike: Strike) -> Box:
    """All of the samples."""
    mark = _marked(stack, k, 0)
    nz, ny, nx = mark.shape
    place = slice(0, nz), slice(0, ny), slice(0, nx)
    return Box(place, mark, shadow.passed_columns(mark, strike.floor, stack.grid.z, 0))


def _box_near_beam(stack: FilmStack, k: int, strike: Strike) -> Box | None:
    """The box about the columns in which the beam reaches the film, down to a band below its floor."""
    z, (_, ny, nx) = stack.grid.z, stack.topology.code.shape
    struck = np.isfinite(strike.met[k])
    deepest = strike.floor[struck].min() - stack.band
    low = max(0, int(np.searchsorted(z, deepest)) - RINGS - 2)
    mark = _marked(stack, k, low)
    passed = shadow.passed_columns(mark, strike.floor, z, low)
    if not passed.any():
        return None
    rows, columns = (_grown(np.flatnonzero((passed | struck).any(axis=a)), n) for a, n in ((1, ny), (0, nx)))
    high = int(np.flatnonzero(mark.any(axis=(1, 2)))[-1]) + 1
    near = np.ascontiguousarray(mark[:high, rows, columns])
    return Box((slice(low, low + high), rows, columns), near, passed)


def _grown(at: np.ndarray, size: int) -> slice:
    return slice(max(0, int(at[0]) - MARGIN), min(size, int(at[-1]) + MARGIN + 1))


def _depths(k: int, rate: float, strike: Strike) -> tuple[np.ndarray, np.ndarray]:
    """How deep film `k` is etched in every column, um, and in which columns it is cut through, `(ny, nx)` each."""
    from scipy.ndimage import maximum_filter

    met = strike.met[k]
    struck = np.isfinite(met)
    cut = struck & (strike.stop != k)
    partly = maximum_filter(struck & ~cut, size=5)
    depth = np.where(struck, rate * (strike.time - np.where(struck, met, strike.time)), 0.0)
    depth, cut = _carry_sideways(struck, depth, cut & ~partly)
    return depth, cut


def _height_above_floor(
    stack: FilmStack, k: int, box: Box, depth: np.ndarray, lateral: np.ndarray, shielded: np.ndarray
) -> np.ndarray:
    """Height of the box's samples above the etched floor of film `k`, float32 um.

    The floor is the film's own surface moved down by the etched depth, so it keeps walls and steps
    thinner than a cell. Columns under a mask take the depth beside its edge, so that the wall is cut
    there; columns `shielded` by a film that no mask covers keep their surface.
    """
    f, shape = stack.topology.fields, stack.topology.code.shape
    top = f.arrays[f.top[k]].reshape(shape)
    gone = f.arrays[max(f.gone[k], 0)].reshape(shape)
    depth = np.ascontiguousarray(depth)
    given = box.mark, top, gone, bool(f.gone[k] >= 0), depth, lateral, shielded
    return np.asarray(shadow.moved_down(*given, stack.grid.z, *box.corner))


def _wall_distance(stack: FilmStack, k: int, strike: Strike, box: Box, wall: float) -> np.ndarray:
    """Distance of the box's samples from the walls that the masks above film `k` leave, um, positive in the opening."""
    side = _side_distance(stack, k, np.unique(strike.stop[strike.stop >= 0]), box)
    leaning = wall != 90.0
    entry = _carry_sideways(box.passed, strike.entry)[0] if leaning else strike.entry
    maps = (np.ascontiguousarray(a[box.columns]) for a in (strike.floor, entry, box.passed))
    angle = np.radians(wall)
    return shadow.wall_distance(
        box.mark, side, *maps, leaning, np.tan(angle), np.sin(angle), stack.grid.z, box.corner[0], stack.grid.cell
    )


def _side_distance(stack: FilmStack, k: int, masks: np.ndarray, box: Box) -> np.ndarray:
    """Planar distance of the box's samples to the nearest wall of the masks above film `k`, float32 um.

    Positive in openings, inf where no mask lies above.
    """
    t = stack.topology
    f, shape = t.fields, t.code.shape
    side = np.full(box.mark.shape, np.inf, np.float32)
    for q in masks:
        if q != k and f.gone[q] >= 0:
            top, floor, gone = (f.arrays[max(n, 0)].reshape(shape) for n in (f.top[q], f.floor[q], f.gone[q]))
            shadow.shadow(
                side, top, floor, gone, bool(f.floor[q] >= 0), t.row_of, t.count, t.start,
                t.interval_code, t.interval_end, k, *box.corner,
            )  # fmt: skip
    return side


def _carry_sideways(known: np.ndarray, *maps: np.ndarray) -> tuple[np.ndarray, ...]:
    """Maps over the columns with the unknown columns taking the nearest known one's value."""
    from scipy.ndimage import distance_transform_edt

    if known.all():
        return maps
    nearest = distance_transform_edt(~known, return_distances=False, return_indices=True)
    return tuple(m[tuple(nearest)] for m in maps)
