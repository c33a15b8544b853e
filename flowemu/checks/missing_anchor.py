"""Tells which part came adrift because it never got an anchor, and where the nearest opening is.

The part's film was put down on a sacrificial film everywhere; when that went, nothing held the part. The mask that
opens the sacrificial film for anchors has no opening under the part: the finding names what it rested on, the step
that took that away, the mask, and how far off the nearest opening is.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from flowemu.findings import Finding
from flowemu.registry import Check

CODE = "missing-anchor"


def run(view: Any) -> Iterator[Finding]:
    """One finding a part without an anchor."""
    from flowemu.checks._anchors import lost_anchor
    from flowemu.stack.wafer import Loosened

    last = {event.part: event for event in view.events(Loosened)}
    for event in last.values():
        if event.state != "adrift" or event.sliver:
            continue
        lost = lost_anchor(view, event)
        if lost is None or lost.mask is None or lost.place is None or lost.distance <= 0:
            continue
        x, y = lost.place
        text = (
            f"part {event.part} ({lost.film}) is adrift: no opening of mask {lost.mask} (step {lost.printed}) lies "
            f"under it; the nearest is {lost.distance:.1f} um away, towards ({x:.4g}, {y:.4g}) um."
        )
        took = f", which {view.step_title(lost.removed)} took away" if lost.removed is not None else ""
        cause = (
            f"It rested on {lost.rested} alone{took}. Draw an opening of {lost.mask} inside the part, so that its film "
            f"reaches what lies below {lost.rested}."
        )
        box = event.box
        at = (0.5 * (box[0] + box[3]), 0.5 * (box[1] + box[4]), 0.5 * (box[2] + box[5]))
        yield Finding(CODE, "error", event.step, lost.film, event.part, at, text, cause, size_um=lost.distance)


SOURCES = ("common practice: a film is anchored where an opening lets it down to what lies below the sacrificial film",)
CHECK = Check("missing anchor", (CODE,), "geometry", run, sources=SOURCES)
