"""Tells places that are thinner than the grid can tell, and the cell that would do.

A film keeps its thickness and a gap between two films its width however thin they are. What needs two cells are the
lines and spaces that a mask draws, and open gaps whose walls a later film would coat.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from flowemu.findings import Finding
from flowemu.registry import Check

CODE = "unresolved"


def run(view: Any) -> Iterator[Finding]:
    """One finding a step."""
    from flowemu.stack.wafer import Unresolved

    for event in view.events(Unresolved):
        cause = f"A cell of {event.size / 2:.2g} um would tell; nothing is said about these places at this one."
        yield Finding(CODE, "warning", event.step, event.film, None, event.at, event.text, cause, size_um=event.size)


SOURCES = ("the resolution of the grid: what is thinner than two cells is told and not guessed",)
CHECK = Check("unresolved", (CODE,), "geometry", run, sources=SOURCES)
