"""Puts down a film.

    - deposit: {film: glass1, material: psg, thickness: 1.8 um, method: lpcvd, coverage: 60 %}
    - deposit: {film: fill, material: polyimide, thickness: 3 um, method: spin, planarisation: 80 %}

What it models. A conformal method (ald, or lpcvd of polysilicon and nitride) offsets the exposed surface by the
thickness, in the open space only and on every side that the tool exposes: a furnace coats both sides of the wafer. A
deposited glass has its thickness on flats and a share of it on upright walls, as `coverage` states. A spin-on film
has a level top, as far as `planarisation` says, and fills the gaps below it.

film : a name of its own, by which later steps and checks speak of it. `wafer`, `resist` and `others` are taken.
material : a name in the process data.
thickness : a length above zero, such as `2 um`; on the flat.
method : how it is put down: lpcvd, pecvd, ald, sputter, evaporation, spin; a name in the process data.
state : of the material, such as `n+` or `annealed`; the material's usual state unless given.
coverage : thickness on an upright wall, as a share of that on the flat, such as `60 %`.
planarisation : of a spin-on film, how much of the steps below is levelled: `100 %` is a flat top, `0 %` follows them.
side : front, back or both; what the real tool does unless given.
name, note : as on every step.

What it refuses. A film name that is taken; a glass over topography without `coverage`; `planarisation` for a film
that is not spun on.
"""

from __future__ import annotations

from typing import Any

from pydantic import Field

from flowemu.errors import StepError
from flowemu.flow.quantities import Fraction, PositiveFraction, PositiveLength
from flowemu.flow.settings import Side, StepSettings
from flowemu.flow.words import Name, Text
from flowemu.registry import StepKind

FLAT = 1e-3  # um; a front whose heights differ by less is flat


class DepositSettings(StepSettings):
    """What is put down, how thick and how."""

    film: Name = Field(description="The film's own name.")
    material: Text = Field(description="A material of the process data.")
    thickness: PositiveLength = Field(description="Thickness on the flat.")
    method: Text = Field(description="How it is put down, such as lpcvd, pecvd, ald, sputter, evaporation, spin.")
    state: Text | None = Field(None, description="State of the material, such as n+ or annealed.")
    coverage: PositiveFraction | None = Field(
        None, description="Thickness on upright walls, as a share of the flat's."
    )
    planarisation: Fraction | None = Field(None, description="How far a spin-on film levels the steps below it.")
    side: Side | None = Field(None, description="The side that is coated; what the real tool does unless given.")


def apply(state: Any, settings: DepositSettings, tools: Any) -> Any:
    """The step on the structure."""
    import numpy as np

    from flowemu.stack.film import Film
    from flowemu.stack.thin import open_gaps
    from flowemu.steps.models.coating import coat, spin, surface_heights

    stack = state.stack
    material, method = tools.material(settings.material), tools.method(settings.method)
    side = settings.side or method.sides
    film = Film(settings.film, material.name, material.state(settings.state), tools.step, stack.surface)
    events = list(open_gaps(stack, tools.step, settings.film))
    laid = tools.laid(stack, settings.film)
    if side == "back":
        return state.now(stack, back=(*state.back, tools.coat(film, settings.thickness)))
    if method.growth == "level":
        grown = spin(stack, film, settings.thickness, 1.0 if settings.planarisation is None else settings.planarisation)
    else:
        flat = float(np.ptp(surface_heights(stack))) < FLAT
        grown = coat(stack, film, settings.thickness, _coverage(settings, material, method, tools, flat))
    back = (*state.back, tools.coat(film, settings.thickness)) if side == "both" else state.back
    return state.now(grown, laid, *events, back=back)


def _coverage(settings: DepositSettings, material: Any, method: Any, tools: Any, flat: bool) -> float:
    """Share of the thickness that vertical walls get."""
    if settings.coverage is not None:
        return settings.coverage
    conformal = method.conformal and not tools.data.needs_coverage(material.name, method.name)
    if conformal or flat:
        return 1.0
    typical = material.typical_coverage or method.typical_coverage
    hint = f", such as coverage: {typical.value}" if typical else ""
    thins = f"{material.name} by {method.name} thins on walls and the surface is not flat"
    raise StepError(f"{thins}; state its coverage of walls{hint}")


def heights(profile: Any, settings: DepositSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile.raised(settings.thickness)


SOURCES = (
    "geometry: a conformal film is the offset of the exact distance from what the open space reaches",
    "common practice: step coverage is the thickness on an upright wall over that on a flat",
)
KIND = StepKind("deposit", DepositSettings, apply, heights, sources=SOURCES)
