"""Removed fields made whole: from values at a film's own samples to distances all around it."""

from __future__ import annotations

import numpy as np

from flowemu.kernels.carry import UNKNOWN, carried
from flowemu.kernels.redistance import BOTH, redistance
from flowemu.stack.film import BAND
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology

RINGS = int(BAND) + 1


def complete(stack: FilmStack, value: np.ndarray, known: np.ndarray, front: bool = False) -> np.ndarray:
    """A removed field over the grid, `(nz, ny, nx)` float32 um, positive where the film goes.

    Parameters
    ----------
    value, known : flat or shaped as the topology's samples, float32 and bool
        What is known at and right beside the film's samples, to be carried outward from there.
    front : bool
        Whether these are a front's depths at all of the film's samples. Then what stays holds distances already, and
        far from it the field is the band. If not, what is not known stays, and all is made a distance except where it
        changes sign.
    """
    t, grid, band = stack.topology, stack.grid, np.float32(stack.band)
    value = value.reshape(t.code.shape)
    known = known.reshape(t.code.shape)
    stays = known & (value < farthest(stack))
    goes = front or (known.any() and not stays.any())
    out = np.full(t.code.shape, band if goes else -band, np.float32)
    if stays.any():
        box = _box(stays if front else known)
        near = value[box].astype(np.float32)
        ring = carried(near, known[box], grid.z[box[0]], grid.cell, RINGS)
        there = ring < UNKNOWN
        near = _level(np.where(there, near, -band), grid.cell, grid.dz[box[0]])
        sides = (1,) if front else BOTH
        out[box] = redistance(near, grid.cell, grid.cell, grid.z[box[0]], stack.band, sides, there)
    return np.ascontiguousarray(t.on_grid(out))


def farthest(stack: FilmStack) -> float:
    """How far a film may reach beyond its last samples, um: deeper than this in what is gone, all of it is gone."""
    return float(np.sqrt(2 * stack.grid.cell**2 + stack.grid.dz.max() ** 2))


def _level(field: np.ndarray, cell: float, dz: np.ndarray) -> np.ndarray:
    """The field with jumps through zero, wider than a distance could make, cut down to a cell on either side."""
    inside = field < 0
    jump = np.zeros(field.shape, bool)
    for axis in range(3):
        low = [slice(None)] * 3
        high = [slice(None)] * 3
        low[axis], high[axis] = slice(None, -1), slice(1, None)
        crossed = inside[tuple(low)] != inside[tuple(high)]
        jump[tuple(low)] |= crossed
        jump[tuple(high)] |= crossed
    most = (1.5 * np.maximum(dz, cell))[:, None, None]
    return np.where(jump, np.clip(field, -most, most), field).astype(np.float32)


def _box(known: np.ndarray) -> tuple[slice, slice, slice]:
    """The box of what is marked, grown by the rings that it is carried outward."""
    out = []
    for axis in range(3):
        at = np.flatnonzero(known.any(axis=tuple({0, 1, 2} - {axis})))
        out.append(slice(max(0, int(at[0]) - RINGS), min(known.shape[axis], int(at[-1]) + RINGS + 1)))
    return out[0], out[1], out[2]


def whole_pieces(stack: FilmStack, k: int, pieces: np.ndarray) -> np.ndarray:
    """A removed field that takes away the listed pieces of film `k` and leaves its others."""
    t: Topology = stack.topology
    roots = t.piece[: t.code.size]
    code = t.code.reshape(-1)
    inner = t.inner
    value = np.full(t.code.size, -np.float32(stack.band), np.float32)
    known = code == k
    value[known & np.isin(roots, pieces)] = stack.band
    mine = inner.code == k
    goes = np.where(np.isin(t.piece[inner.node], pieces), np.float32(stack.band), -np.float32(stack.band))
    for end in (t.samples[inner.row], t.samples[inner.row] + t.strides[inner.direction]):
        at = mine & ~known[end]
        value[end[at]] = goes[at]
        known[end[at]] = True
    return complete(stack, value, known)
