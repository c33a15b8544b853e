"""Tells films that an etch ate although no step meant to etch them.

A step means to etch the films that it clears; timed by anything else, those that it etches at a fifth or more of the
fastest rate it meets. Resist is there to be eaten and is not counted. The depth lost is the rate times the time since
the etchant first reached the film, at its first place; the share is of the film's usual thickness.

Limits, common practice (key `unmeant_loss`): a note above 5 % and 10 nm, a warning above 20 %, an error when the film
is breached.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from flowemu.findings import Finding
from flowemu.registry import Check

CODE = "film-attacked"
NOTE = (("fraction", 0.05), ("length", 0.010))
WARNING = (("fraction", 0.20),)
SMALL = 0.010  # um: below this nothing is told unless the film is breached


def run(view: Any) -> Iterator[Finding]:
    """One finding a step and film."""
    from flowemu.stack.wafer import Cut

    for cut in view.events(Cut):
        for loss in cut.losses:
            if loss.meant or cut.verb not in ("etch", "release"):
                continue
            severity = _severity(view, loss)
            if severity is None:
                continue
            eaten = f"{loss.depth * 1000:.3g} nm of its {loss.thickness:.3g} um"
            if loss.film == "wafer":
                eaten = f"{loss.depth * 1000:.3g} nm deep"
            text = f"{view.step_title(cut.step)} eats film {loss.film} ({loss.material}): {eaten}"
            if severity == "error":
                text += "; it is breached"
            cause = (
                f"Its rate there is {loss.rate * 6e4:.3g} nm/min and it lies open to the etchant for part of the "
                f"{cut.time / 60:.3g} min. Shorten the overetch, protect the film, or make it thicker."
            )
            yield Finding(CODE, severity, cut.step, loss.film, None, loss.at, text, cause, size_um=loss.depth)


def _severity(view: Any, loss: Any) -> str | None:
    share = loss.depth / loss.thickness if loss.thickness > 0 else 0.0
    if loss.film == "wafer":
        share = 0.0 if loss.depth < SMALL else 0.06
    elif share >= 1.0:
        return "error" if loss.through else "warning"
    for severity, default in (("error", ()), ("warning", WARNING), ("note", NOTE)):
        limit = view.limit("unmeant_loss", severity, default)
        if limit and all({"fraction": share, "length": loss.depth}[kind] > value for kind, value in limit):
            return severity
    return None


SOURCES = ("common practice: selectivity is finite, and a film that no step means to etch is watched in every etch",)
CHECK = Check("attacked film", (CODE,), "geometry", run, sources=SOURCES)
