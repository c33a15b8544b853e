"""Tells loose parts: captive with their play, adrift, or cut by the window's edge.

A part is held if it hangs together with the wafer. A loose one is moved through free space, along each axis, in a
flood of small offsets, and turned about z: if it cannot leave it is captive, and its play along each axis is told;
otherwise it is adrift, and the rinse takes it. A part that reaches a side of the window may be held outside it.

Nameless slivers that come loose, such as stringers, are told together, one warning a film.

An adrift part that never had an anchor is told by `missing-anchor` instead.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from flowemu.findings import Finding
from flowemu.registry import Check

ADRIFT, CAPTIVE, CUT, RESIDUE = "part-adrift", "part-captive", "part-cut-by-window", "loose-residue"


def run(view: Any) -> Iterator[Finding]:
    """One finding a loose part."""
    from flowemu.checks._anchors import lost_anchor
    from flowemu.stack.wafer import Loosened

    last = {event.part: event for event in view.events(Loosened)}
    yield from _residue(view, [event for event in last.values() if event.sliver])
    for event in last.values():
        if event.sliver:
            continue
        centre = _centre(event.box)
        films = " and ".join(event.films)
        if event.state == "captive":
            play = _play(event.play)
            text = f"part {event.part} ({films}) is loose but cannot leave; its play is {play}"
            yield Finding(CAPTIVE, "note", event.step, event.films[0], event.part, centre, text, f"{event.searched}.")
        elif event.state == "adrift":
            lost = lost_anchor(view, event)
            if lost is not None and lost.mask is not None and lost.distance > 0:
                continue
            text = f"part {event.part} ({films}) is adrift after {view.step_title(event.step)}"
            cause = _cause(view, event, lost)
            yield Finding(ADRIFT, "error", event.step, event.films[0], event.part, centre, text, cause)
        else:
            text = f"part {event.part} ({films}) is cut by the window's edge; whether it is held cannot be told"
            cause = "Widen the window, or name the side as a mirror if it is one."
            yield Finding(CUT, "note", event.step, event.films[0], event.part, centre, text, cause)


def _residue(view: Any, slivers: list[Any]) -> Iterator[Finding]:
    """One warning a film of which slivers came loose."""
    for film in sorted({event.films[0] for event in slivers}):
        mine = [event for event in slivers if event.films[0] == film]
        worst = max(mine, key=lambda event: event.volume)
        pieces = "a sliver" if len(mine) == 1 else f"{len(mine)} slivers"
        where = view.step_title(worst.step)
        text = f"{pieces} of film {film} came loose in {where}; the largest is {worst.volume:.2g} um3"
        cause = "An earlier etch of the film left them, mostly on walls; a longer overetch there would clear them."
        yield Finding(RESIDUE, "warning", worst.step, film, None, _centre(worst.box), text, cause)


def _cause(view: Any, event: Any, lost: Any) -> str:
    if lost is None or lost.removed is None:
        return f"Nothing joins it to the wafer, and {event.searched}."
    return f"It rested on {lost.rested}, which {view.step_title(lost.removed)} took away, and {event.searched}."


def _centre(box: tuple[float, ...]) -> tuple[float, float, float]:
    return tuple(0.5 * (box[k] + box[k + 3]) for k in range(3))  # type: ignore[return-value]


def _play(play: tuple[float | None, ...] | None) -> str:
    if play is None:
        return "not known"
    texts = ["open" if p is None else f"{p:.3g}" for p in play]
    pairs = zip("xyz", texts[::2], texts[1::2], strict=True)
    return ", ".join(f"{axis} -{low} +{high}" for axis, low, high in pairs) + " um"


SOURCES = ("common practice: a part that nothing joins to the wafer is lost unless other parts hold it captive",)
CHECK = Check("loose parts", (ADRIFT, CAPTIVE, CUT, RESIDUE), "geometry", run, sources=SOURCES)
"""Common practice: a part that nothing holds after its release is lost in the rinse."""
