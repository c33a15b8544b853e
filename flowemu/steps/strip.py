"""Removes a film altogether, and nothing else.

    - strip: resist
    - strip: {film: resist, with: o2 plasma}

What it models. Every bit of the film that the open space reaches goes; the other films are untouched. `resist` stands
for all coats that are on the wafer.

film : the film, by its name; `strip: resist` is short for `strip: {film: resist}`.
with : the stripper, for the run sheet.
name, note : as on every step.

What it refuses. A film that is not there.
"""

from __future__ import annotations

from typing import Any

from pydantic import Field

from flowemu.flow.settings import StepSettings
from flowemu.flow.words import Name, Text
from flowemu.registry import StepKind


class StripSettings(StepSettings):
    """Which film goes."""

    film: Name = Field(description="The film that is removed.")
    stripper: Text | None = Field(None, alias="with", description="What it is removed with.")


def apply(state: Any, settings: StripSettings, tools: Any) -> Any:
    """The step on the structure."""
    from flowemu.steps.models.strip import strip_film

    return strip_film(state, settings.film, settings.stripper or "strip", tools)


def heights(profile: Any, settings: StripSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile


SOURCES = ("common practice: a strip takes all of a film that the bath can reach and leaves what is buried",)
KIND = StepKind("strip", StripSettings, apply, heights, short="film", sources=SOURCES)
