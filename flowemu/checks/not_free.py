"""Tells film left under a part that its release should have freed, and the time still needed.

A part counts as meant to be free if its release names it under `frees`, or if the flow expects it to be free or
captive. From the arrival times of the release, with no further run: when the last film that the release etches lets go
of the part, where that is, and how much longer the release must last.
"""

from __future__ import annotations

from collections.abc import Iterator
from math import isfinite
from typing import Any

from flowemu.findings import Finding
from flowemu.registry import Check

CODE = "part-not-free"


def run(view: Any) -> Iterator[Finding]:
    """One finding a part that is not free."""
    from flowemu.stack.wafer import Cut

    expected = {e.subject.part for e in view.flow.expect if e.kind in ("free", "captive")}
    last: dict[str, tuple[Any, Any]] = {}
    for cut in view.events(Cut):
        if cut.verb == "release":
            wanted = expected | set(view.flow.steps[cut.step - 1].settings.frees or ())
            for freed in cut.freed:
                if freed.part in wanted:
                    last[freed.part] = (cut, freed)
    for part, (cut, freed) in last.items():
        if freed.time <= cut.time:
            continue
        x, y, z = freed.at or (0.0, 0.0, 0.0)
        if isfinite(freed.time):
            plan = f"{_time(freed.time)} in all; {_time(cut.time)} are planned"
            need = f"{_time(freed.time - cut.time)} more are needed ({plan})"
        else:
            need = "the etchant never gets there"
        text = f"{freed.film} is left under part {part} after {view.step_title(cut.step)}: {need}"
        cause = f"The last of it is at ({x:.4g}, {y:.4g}, {z:.3g}) um, farthest from the etchant's way in. " + (
            "Lengthen the release, or add etch holes there." if isfinite(freed.time) else "Open a way to it."
        )
        yield Finding(CODE, "error", cut.step, freed.film, part, freed.at, text, cause)


def _time(seconds: float) -> str:
    return f"{seconds:.3g} s" if seconds < 120 else f"{seconds / 60:.3g} min"


SOURCES = ("common practice: a release ends when the sacrificial film is gone from under every part that must move",)
CHECK = Check("not free", (CODE,), "geometry", run, sources=SOURCES)
