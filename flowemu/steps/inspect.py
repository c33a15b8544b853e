"""Looks at the wafer: runs all checks and makes the figures at this point of the flow.

    - inspect:
    - inspect: {name: before release, note: look for stringers}

What it models. Nothing changes; what the checks find is reported under this step.

name, note : as on every step; the name stands in the figures' file names.

What it refuses. Nothing.
"""

from __future__ import annotations

from typing import Any

from flowemu.flow.settings import StepSettings
from flowemu.registry import StepKind


class InspectSettings(StepSettings):
    """Only what every step carries."""


def apply(state: Any, settings: InspectSettings, tools: Any) -> Any:
    """The step on the structure."""
    return state


def heights(profile: Any, settings: InspectSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile


SOURCES = ("common practice: a flow is looked at between its steps",)
KIND = StepKind("inspect", InspectSettings, apply, heights, sources=SOURCES)
