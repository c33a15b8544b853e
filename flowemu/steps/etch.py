"""Removes material with an etchant, through whatever is open.

    - etch: {with: oxide rie, clears: [glass2, glass1], over: 20 %}
    - etch: {with: bhf 5:1, time: 4 min}
    - etch: {with: poly rie, clears: poly1, over: 25 %, rates: {psg: 2 nm/min}}

What it models. An isotropic etchant (wet, vapour, or a plasma without direction) reaches every point of the open
space's boundary and works inward at each film's rate. A directional one works down from above, behind what shades it,
and erodes its mask by the same law.

with : the etchant, a name in the process data.
time, depth, clears, until : exactly one of the four.
  time : a duration such as `12 min`.
  depth : how deep the open, flat area is etched, such as `0.9 um`.
  clears : a film or a list of films; runs until 95 % of their open, flat area is gone. Extra height on walls is not
    counted, so that stringers occur as they do in the fab.
  until : a film; runs until it is exposed over 90 % of the open area.
over : overetch as a share of that time, such as `20 %`; only after `clears` or `until`.
profile : isotropic or directional; the etchant's own unless given. `deep` and `crystal` are not built yet.
rates : own rates by film or material, such as `{psg: 2 nm/min}`; `others` is for every film without a rate.
wall : angle of the etched wall; 90 deg is upright, below that the opening narrows downward.
lateral : sideways etch per side, as a share of the depth, such as `10 %`.
uniformity : half the range of the rate over the wafer, such as `5 %`.
side : front, back or both; what the real tool does unless given.
concentration, temperature : of the bath, such as `30 wt%`, `80 degC`.
name, note : as on every step.

What it refuses. More or less than one amount; a film that it meets without a rate in the data or in `rates`; a film
that is not there.
"""

from __future__ import annotations

from typing import Any

from flowemu.flow.removal import RemovalSettings
from flowemu.registry import StepKind


class EtchSettings(RemovalSettings):
    """What is etched, with what, and for how long."""


def apply(state: Any, settings: EtchSettings, tools: Any) -> Any:
    """The step on the structure."""
    from flowemu.steps.models.removal import carry_out

    return carry_out(state, settings, tools)


def heights(profile: Any, settings: EtchSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile.cut(settings, tools)


SOURCES = (
    "J. A. Sethian, PNAS 93 (1996) 1591, doi:10.1073/pnas.93.4.1591, for arrival times",
    "common practice: an overetch is a share of the time that clears the flat; rates come from the process data",
)
KIND = StepKind("etch", EtchSettings, apply, heights, sources=SOURCES)
