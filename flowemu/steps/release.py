"""Frees the moving parts: an etch, then drying. What is then neither held nor captive is gone.

    - release: {with: hf 49, frees: [rotor], over: 50 %, dry: critical point}
    - release: {with: vapour hf, time: 20 min}

What it models. As `etch`, most often isotropic and on both sides; its time may follow from the parts that it must
free. A part is free when no film that the release etches touches it any more; films that it etches less than a
fiftieth as fast as the fastest, such as the nitride that an anchor stands on, do not count.

with : the etchant, a name in the process data.
time, depth, clears, until, frees : exactly one of the five; the first four as in `etch`.
  frees : a part or a list of parts, by their names under `parts:` or their labels; runs until all are free.
over : overetch as a share of that time, such as `50 %`; only after `clears`, `until` or `frees`.
dry : critical point, air, sublimation or none; how the wafer is dried. A vapour needs none.
profile, rates, wall, lateral, uniformity, side, concentration, temperature : as in `etch`.
name, note : as on every step.

What it refuses. What `etch` refuses; a part that is not named.
"""

from __future__ import annotations

from typing import Any, ClassVar, Literal

from pydantic import Field

from flowemu.flow.removal import RemovalSettings
from flowemu.flow.words import Names
from flowemu.registry import StepKind


class ReleaseSettings(RemovalSettings):
    """What frees the parts, for how long, and how they are dried."""

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = (("time", "depth", "clears", "until", "frees"),)
    only_with: ClassVar[dict[str, tuple[str, ...]]] = {"over": ("clears", "until", "frees")}

    frees: Names | None = Field(None, description="Runs until these parts are free.")
    dry: Literal["critical point", "air", "sublimation", "none"] | None = Field(
        None, description="How the wafer is dried."
    )


def apply(state: Any, settings: ReleaseSettings, tools: Any) -> Any:
    """The step on the structure."""
    from flowemu.stack.bodies import find_parts
    from flowemu.steps.models.release import let_go
    from flowemu.steps.models.removal import carry_out

    parts = [part for part in find_parts(state.stack, tools.places) if part.named]
    return let_go(carry_out(state, settings, tools, parts), tools)


def heights(profile: Any, settings: ReleaseSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile.cut(settings, tools)


SOURCES = (
    "J. A. Sethian, PNAS 93 (1996) 1591, doi:10.1073/pnas.93.4.1591, for arrival times",
    "common practice: what is neither held nor captive is lost in the rinse and in drying",
)
KIND = StepKind("release", ReleaseSettings, apply, heights, sources=SOURCES)
