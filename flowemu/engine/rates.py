"""Which rates decided a run although the flow states them itself or no source backs them."""

from __future__ import annotations

from flowemu.engine.tools import Tools
from flowemu.flow.flow import Flow
from flowemu.stack.wafer import Cut, Wafer

WEAK = ("from memory", "unverified")


def deciding_rates(flow: Flow, tools: Tools, wafer: Wafer) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Those overridden in the flow and those from memory: materials and etchants whose rates took something away."""
    overridden: dict[str, None] = {}
    weak: dict[str, None] = {}
    for event in wafer.events:
        if not isinstance(event, Cut) or event.verb not in ("etch", "release"):
            continue
        settings = flow.steps[event.step - 1].settings
        states = {s.settings.film: s.settings.state for s in flow.steps if s.verb == "deposit"}
        for loss in event.losses:
            text = f"{loss.material} in {event.agent}"
            if loss.film in settings.rates or loss.material in settings.rates:
                overridden[text] = None
                continue
            datum = tools.rate(event.agent, loss.material, states.get(loss.film))
            if datum.overridden:
                overridden[text] = None
            elif datum.standing.startswith(WEAK):
                weak[text] = None
    return tuple(overridden), tuple(weak)
