"""Heats the wafer: changes the state of its materials, not their shape.

    - anneal: {temperature: 1050 degC, time: 60 min}

What it models. Each film's material takes the state that the process data gives for this temperature, such as `psg`
from `as deposited` to `annealed`; its etch rates change with it.

temperature : such as `1050 degC`.
time : such as `60 min`.
name, note : as on every step.

What it refuses. A temperature or a time that is missing.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from pydantic import Field

from flowemu.errors import StepError
from flowemu.flow.quantities import Duration, Temperature
from flowemu.flow.settings import StepSettings
from flowemu.registry import StepKind


class AnnealSettings(StepSettings):
    """How hot and how long."""

    temperature: Temperature = Field(description="Temperature of the furnace.")
    time: Duration = Field(description="Time at that temperature.")


def apply(state: Any, settings: AnnealSettings, tools: Any) -> Any:
    """The step on the structure."""
    stack = state.stack
    for k, film in enumerate(stack.films):
        if film.name == "resist":
            raise StepError("resist is still on the wafer and does not go into a furnace; strip it first")
        after = tools.data.anneal(film.material, film.state, settings.temperature, settings.time)
        if after != film.state:
            stack = stack.turned(k, state=after)
    back = tuple(
        replace(coat, state=tools.data.anneal(coat.material, coat.state, settings.temperature, settings.time))
        for coat in state.back
    )
    return state.now(stack, back=back)


def heights(profile: Any, settings: AnnealSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile


SOURCES = ("common practice: a furnace densifies glasses and relaxes polysilicon; rates are the process data's",)
KIND = StepKind("anneal", AnnealSettings, apply, heights, sources=SOURCES)
