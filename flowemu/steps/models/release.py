"""After a release has dried: what is neither held nor captive is gone."""

from __future__ import annotations

from typing import Any

import numpy as np

from flowemu.stack.bodies import Part, box_and_volume, find_parts, part_columns, surface_points
from flowemu.stack.loose import Verdict, judge
from flowemu.stack.removed import whole_pieces
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Loosened, Wafer

DUST = 1.0  # cells^3: a nameless loose body smaller than this is rounding, and the rinse takes it
SLIVER = 64.0  # cells^3: one smaller than this is residue and not a part


def let_go(wafer: Wafer, tools: Any) -> Wafer:
    """The wafer without the loose bodies that can leave, and what was found of every loose body."""
    stack = wafer.stack
    events, gone = [], []
    for part in find_parts(stack, tools.places):
        if part.held:
            continue
        points = surface_points(stack, part)
        box, volume = box_and_volume(stack, part, points)
        if not part.named and volume < DUST * stack.grid.cell**3:
            gone.append(part)
            continue
        sliver = not part.named and volume < SLIVER * stack.grid.cell**3
        verdict = _verdict(stack, part, points, sliver)
        films = tuple(stack.films[k].name for k in sorted(part.films))
        found = (verdict.state, volume, box, verdict.play, verdict.searched)
        events.append(Loosened(tools.step, part.name, films, *found, part_columns(stack, part), points[:, :2], sliver))
        if verdict.state == "adrift":
            gone.append(part)
    return wafer.now(_without(stack, gone) if gone else stack, *events)


def _verdict(stack: FilmStack, part: Part, points: np.ndarray, sliver: bool) -> Verdict:
    """Whether a loose body can leave; residue always does, and of a part cut by the window it is not known."""
    if sliver:
        return Verdict("adrift", None, "")
    if part.at_side:
        return Verdict("cut by the window", None, "its end lies outside the window")
    return judge(stack, part, points)


def _without(stack: FilmStack, parts: list[Part]) -> FilmStack:
    """The stack without the given bodies."""
    pieces = np.array(sorted(set().union(*(part.pieces for part in parts))))
    films = sorted(set().union(*(part.films for part in parts)))
    return stack.carve({k: whole_pieces(stack, k, pieces) for k in films})
