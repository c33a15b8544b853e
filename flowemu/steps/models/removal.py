"""An etch or release carried out: rates, amount, what goes, and the record of it."""

from __future__ import annotations

from typing import Any

import numpy as np

from flowemu.errors import StepError
from flowemu.flow.removal import RemovalSettings
from flowemu.kernels import fronts
from flowemu.stack.bodies import Part
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Cut, Freed, Wafer
from flowemu.steps.models.directional import Beam
from flowemu.steps.models.etch_time import etch_time, free_time
from flowemu.steps.models.isotropic import Arrival, arrive
from flowemu.steps.models.losses import losses_of, number_after
from flowemu.steps.models.recipe import Etch, film_rate


def carry_out(wafer: Wafer, settings: RemovalSettings, tools: Any, parts: list[Part] | None = None) -> Wafer:
    """The wafer after an etch or a release, with a `Cut` event that says what it took.

    Raises
    ------
    StepError
        A film that the etch meets has no rate; a film to clear is not there or is never cleared.
    """
    etch = Etch.of(wafer.stack, settings, tools)
    time, arrival = etch_time(etch, parts or [])
    stack, first_times = _remove(etch, time, arrival)
    _refuse_unknown(etch, stack)
    losses = tuple(losses_of(etch, stack, time, first_times))
    freed: tuple[Freed, ...] = ()
    if parts and arrival is not None:
        freed = tuple(free_time(arrival, part) for part in parts)
    agent = settings.etchant
    mask = wafer.printed.mask if wafer.printed is not None else None
    cut = Cut(tools.step, tools.verb, agent, time, mask, losses, freed)
    back = wafer.back
    if tools.wets_back(settings):
        back = _back_after(wafer, settings, tools, time)
    return wafer.now(stack, cut, back=back)


def _back_after(wafer: Wafer, settings: RemovalSettings, tools: Any, time: float) -> tuple[Any, ...]:
    rates = {}
    for coat in wafer.back:
        value, _ = film_rate(coat.name, coat.material, coat.state, settings, tools)
        rates[coat.name] = value or 0.0
    return wafer.thinned_back(rates, time)


def _remove(etch: Etch, time: float, arrival: Arrival | None) -> tuple[FilmStack, dict[int, float]]:
    """The stack after the etch and when each film was first reached, s."""
    if arrival is not None:
        first = {k: float(np.min(arrival.of_film(k)[1], initial=np.inf)) for k in etch.rates if etch.rates[k] > 0}
        return etch.stack.carve(arrival.removed(time)), first
    ray = Beam(etch.stack, etch.rates, etch.wall)
    strike = ray.strike(time)
    first = strike.first_times()
    stack = etch.stack.carve(ray.removed(time, strike))
    if etch.lateral > 0:
        names = {film.name: etch.rates[k] * etch.lateral for k, film in enumerate(etch.stack.films)}
        sideways = {k: names.get(film.name, 0.0) for k, film in enumerate(stack.films)}
        stack = stack.carve(arrive(stack, sideways, time).removed(time))
    return stack, first


def _refuse_unknown(etch: Etch, after: FilmStack) -> None:
    """Refuse the etch if a film without a rate lay bare to it before or after."""
    for stack in (etch.stack, after):
        for k, why in etch.unknown.items():
            film = etch.stack.films[k]
            here = number_after(film, stack)
            if here is not None and _is_bare(stack, here):
                state = f", {film.state}" if film.state else ""
                agent = etch.settings.etchant
                raise StepError(
                    f"no rate for film '{film.name}' ({film.material}{state}) in '{agent}', which meets it: "
                    f"{why}; give one under rates, such as rates: {{{film.name}: 5 nm/min}}"
                )


def _is_bare(stack: FilmStack, k: int) -> bool:
    """Whether the open space borders on film `k`."""
    t = stack.topology
    edges = t.strides, t.count, t.start, t.interval_code, k
    code = t.code.reshape(-1)
    beside = fronts.bare_voids(t.samples, code, code < 0, *edges)
    return bool(beside.any()) and bool(fronts.bare_voids(t.samples, code, t.open_space.reshape(-1), *edges).any())
