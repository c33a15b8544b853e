"""The parts of the finished structure and their states."""

from __future__ import annotations

from flowemu.engine.view import View
from flowemu.record import PartRow
from flowemu.stack.bodies import Part, box_and_volume, contact_area, find_parts
from flowemu.stack.loose import judge
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Loosened

DUST = 1.0  # cells^3: a nameless loose body below this is left out


def part_rows(view: View) -> tuple[PartRow, ...]:
    """Every named part, then every loose body: what it is made of, how large, and whether it is held."""
    stack = view.wafer.stack
    loosened = {event.part: event for event in view.events(Loosened) if not event.sliver}
    rows: dict[str, PartRow] = {}
    for part in find_parts(stack, view.tools.places):
        row = _row(stack, part, loosened.get(part.name))
        if part.named or part.name in loosened or (row.volume_um3 or 0.0) >= DUST * stack.grid.cell**3:
            rows[part.name] = row
    for name, event in loosened.items():
        if name not in rows:
            rows[name] = PartRow(name, event.films, event.volume, event.box, event.state, 0.0, _open(event.play))  # type: ignore[arg-type]
    if view.ended:
        for name in view.tools.places:
            rows.setdefault(name, PartRow(name, (), None, None, "gone"))
    return tuple(rows.values())


def _row(stack: FilmStack, part: Part, event: Loosened | None) -> PartRow:
    names = tuple(stack.films[k].name for k in sorted(part.films))
    box, volume = box_and_volume(stack, part)
    contact = contact_area(stack, part.pieces) if part.held else 0.0
    if part.held:
        return PartRow(part.name, names, volume, box, "held", contact, None)
    if event is not None:
        return PartRow(part.name, names, volume, box, event.state, contact, _open(event.play))  # type: ignore[arg-type]
    if part.at_side:
        return PartRow(part.name, names, volume, box, "cut by the window", contact, None)
    verdict = judge(stack, part)
    return PartRow(part.name, names, volume, box, verdict.state, contact, _open(verdict.play))  # type: ignore[arg-type]


def _open(play: tuple[float | None, ...] | None) -> tuple[float, ...] | None:
    """Play with infinity where nothing stops the part."""
    return None if play is None else tuple(float("inf") if p is None else p for p in play)
