"""Holds the finished structure against the flow's `expect:` section.

`held`, `captive` and `free` judge a part; `thickness` the total thickness of a film at a place. An expectation about a
part that another error explains is told as a note, so that one mistake is not counted twice.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from flowemu.findings import Finding
from flowemu.registry import Check

CODE = "expectation-failed"


def run(view: Any) -> Iterator[Finding]:
    """One finding an expectation that fails."""
    if not view.ended:
        return
    for outcome in view.outcomes:
        if outcome.holds:
            continue
        if outcome.part is not None:
            text = f"part {outcome.part} is expected to be {outcome.wanted}, but {outcome.found}"
            at = None
        else:
            x, y = outcome.at
            place = f"at ({x:g}, {y:g}) um"
            text = f"film {outcome.film} is expected to measure {outcome.wanted} {place}, but {outcome.found}"
            at = (x, y)
        cause = "The flow's expect section says so."
        yield Finding(CODE, "error", view.step, outcome.film, outcome.part, at, text, cause)


SOURCES = ("the flow's own expect section",)
CHECK = Check("expectations", (CODE,), "geometry", run, sources=SOURCES)
