"""The flow's expectations, held against the finished wafer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from flowemu.flow.flow import Flow
from flowemu.stack.columns import column
from flowemu.stack.wafer import Cut, Wafer

SLACK = 1e-6  # um


@dataclass(frozen=True)
class Outcome:
    """One entry of `expect:`: what it is about, whether it holds, and what was found."""

    index: int
    kind: str
    part: str | None
    film: str | None
    at: tuple[float, float] | None
    holds: bool
    wanted: str
    found: str


def outcomes(flow: Flow, wafer: Wafer, parts: Sequence[Any]) -> list[Outcome]:
    """Every expectation and how it came out."""
    states = {row.name: row.state for row in parts}
    out = []
    for index, entry in enumerate(flow.expect):
        if entry.kind == "thickness":
            out.append(_thickness(index, entry.thickness, wafer))
        else:
            out.append(_part(index, entry.kind, entry.subject.part, states, wafer))
    return out


def _part(index: int, kind: str, part: str, states: dict[str, str], wafer: Wafer) -> Outcome:
    state = states.get(part, "gone")
    if kind == "free":
        holds, found = _free(part, wafer)
        holds = holds and state != "gone"
        found = found if state != "gone" else "it is gone"
    else:
        holds, found = state == kind, f"it is {state}"
    return Outcome(index, kind, part, None, None, holds, kind, found)


def _free(part: str, wafer: Wafer) -> tuple[bool, str]:
    """Whether the last release that met the part freed it."""
    for event in reversed(wafer.events):
        if isinstance(event, Cut) and event.verb == "release":
            for freed in event.freed:
                if freed.part == part:
                    if freed.time <= event.time:
                        return True, "it is free"
                    return False, f"{freed.film} still touches it"
    return False, "no release has freed it"


def _thickness(index: int, entry: Any, wafer: Wafer) -> Outcome:
    stack = wafer.stack
    layers = [layer for layer in column(stack, *entry.at) if stack.films[layer.film].name == entry.film]
    thickness = sum(layer.high - layer.low for layer in layers)
    low = entry.at_least if entry.at_least is not None else 0.0
    high = entry.at_most if entry.at_most is not None else float("inf")
    bounds = [f"at least {low:g} um"] if entry.at_least is not None else []
    bounds += [f"at most {high:g} um"] if entry.at_most is not None else []
    holds = low - SLACK <= thickness <= high + SLACK
    return Outcome(
        index, "thickness", None, entry.film, entry.at, holds, " and ".join(bounds), f"it is {thickness:.4g} um"
    )
