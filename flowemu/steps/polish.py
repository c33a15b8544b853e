"""Polishes the front flat (CMP): everything above a level plane goes, whatever it is made of.

    - polish: {depth: 0.8 um}
    - polish: {to: glass1}

What it models. A rigid, level pad: no dishing, no erosion.

depth, to : exactly one of the two.
  depth : how far below the highest point of the front the plane lies, such as `0.8 um`.
  to : a film; the plane lies at this film's highest point, so that it is just exposed.
name, note : as on every step.

What it refuses. Both or neither of `depth` and `to`; a film that is not there.
"""

from __future__ import annotations

from typing import Any, ClassVar

from pydantic import Field

from flowemu.flow.quantities import PositiveLength
from flowemu.flow.settings import StepSettings
from flowemu.flow.words import Name
from flowemu.registry import StepKind


class PolishSettings(StepSettings):
    """How far down the front is polished."""

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = (("depth", "to"),)

    depth: PositiveLength | None = Field(None, description="Depth of the plane below the highest point.")
    to: Name | None = Field(None, description="The film that the polish just exposes.")


def apply(state: Any, settings: PolishSettings, tools: Any) -> Any:
    """The step on the structure."""
    from flowemu.steps.models.polish import polish_to

    return polish_to(state, settings.depth, settings.to, tools)


def heights(profile: Any, settings: PolishSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile


SOURCES = ("common practice: chemical-mechanical polishing takes off what stands above a level plane",)
KIND = StepKind("polish", PolishSettings, apply, heights, sources=SOURCES)
