"""After a release has dried: what is neither held nor captive is gone."""

from __future__ import annotations

from typing import Any

import numpy as np

from flowemu.kernels import fronts
from flowemu.stack.bodies import Part, box_and_volume, find_parts, part_columns
from flowemu.stack.loose import judge
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Loosened, Wafer

DUST = 1.0  # cells^3: a nameless loose body smaller than this is residue that the rinse takes


def let_go(wafer: Wafer, tools: Any) -> Wafer:
    """The wafer without the loose bodies that can leave, and what was found of every loose body."""
    stack = wafer.stack
    events, gone = [], []
    for part in find_parts(stack, tools.places):
        if part.held:
            continue
        box, volume = box_and_volume(stack, part)
        if not part.named and volume < DUST * stack.grid.cell**3:
            gone.append(part)
            continue
        if part.at_side:
            state, play, searched = "cut by the window", None, "its end lies outside the window"
        else:
            verdict = judge(stack, part)
            state, play, searched = verdict.state, verdict.play, verdict.searched
        names = tuple(stack.films[k].name for k in sorted(part.films))
        events.append(
            Loosened(tools.step, part.name, names, state, volume, box, play, searched, part_columns(stack, part))  # type: ignore[arg-type]
        )
        if state == "adrift":
            gone.append(part)
    return wafer.now(_without(stack, gone) if gone else stack, *events)


def _without(stack: FilmStack, parts: list[Part]) -> FilmStack:
    """The stack without the given bodies."""
    t = stack.topology
    fields = {}
    pieces = np.array(sorted(set().union(*(part.pieces for part in parts))))
    roots = t.piece[: t.code.size].reshape(t.code.shape)
    inner = t.inner
    thin_gone = np.isin(t.piece[inner.node], pieces)
    for k in sorted(set().union(*(part.films for part in parts))):
        value = np.full(t.code.shape, -np.float32(stack.band), np.float32)
        value[(t.code == k) & np.isin(roots, pieces)] = stack.band
        thin = thin_gone & (inner.code == k)
        flat = value.reshape(-1)
        for end in (t.samples[inner.row[thin]], t.samples[inner.row[thin]] + t.strides[inner.direction[thin]]):
            flat[end] = stack.band
        known = value > 0
        want = (t.row_of.reshape(t.code.shape) >= 0) & (t.code != k)
        for _ in range(2):
            value, known = fronts.spread_once(value, known, want)
        fields[k] = np.ascontiguousarray(t.on_grid(value))
    return stack.carve(fields)
