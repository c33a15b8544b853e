"""How long an etch runs: from the amount that the flow states, and the structure."""

from __future__ import annotations

from typing import Any

import numpy as np

from flowemu.errors import StepError
from flowemu.kernels import fronts
from flowemu.stack.bodies import Part
from flowemu.stack.columns import topmost
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Freed
from flowemu.steps.models.directional import EXPOSED, Beam
from flowemu.steps.models.isotropic import Arrival, arrive
from flowemu.steps.models.media import SLOWEST_SHARE
from flowemu.steps.models.recipe import Etch


def etch_time(etch: Etch, parts: list[Part]) -> tuple[float, Arrival | None]:
    """How long the etch runs, s, and the arrival times where it is isotropic."""
    settings = etch.settings
    how, value = settings.stated_amount()
    if etch.directional:
        return _beam_time(etch, how, value), None
    if how == "time":
        return value, arrive(etch.stack, etch.rates, np.inf if parts else value)  # when a part comes free may be later
    if how == "depth":
        time = value / _flat_rate(etch)
        return time, arrive(etch.stack, etch.rates, time)
    arrival = arrive(etch.stack, etch.rates)
    if how == "clears":
        time = _isotropic_clear_time(etch, arrival, etch.numbers(value))
    elif how == "until":
        time = _isotropic_expose_time(etch, arrival, etch.numbers((value,))[0])
    else:
        time = _free_all_time(arrival, parts, value)
    if not np.isfinite(time):
        raise StepError(f"{how} {_said(value)}: the etchant never gets there")
    return time * (1 + settings.over), arrival


def _said(value: Any) -> str:
    return ", ".join(value) if isinstance(value, tuple | list) else str(value)


def _beam_time(etch: Etch, how: str, value: Any) -> float:
    if how == "time":
        return float(value)
    if how == "depth":
        return float(value) / _flat_rate(etch)
    ray = Beam(etch.stack, etch.rates)
    if how == "clears":
        time = ray.clear_time(etch.numbers(value))
    elif how == "until":
        time = ray.expose_time(etch.numbers((value,))[0])
    else:
        raise StepError("a directional etch cannot be timed by the parts that it frees")
    if not np.isfinite(time):
        raise StepError(f"{how} {_said(value)}: no open area leads there")
    return time * (1 + etch.settings.over)


def _flat_rate(etch: Etch) -> float:
    """Rate of the film that covers most of the open area, um/s."""
    first = topmost(etch.stack)
    resist = [k for k, film in enumerate(etch.stack.films) if film.name == "resist"]
    shown = first[(first >= 0) & ~np.isin(first, resist)]
    if len(shown) == 0:
        raise StepError("depth: nothing is open to the etch")
    k = int(np.bincount(shown).argmax())
    if etch.rates[k] <= 0:
        film = etch.stack.films[k]
        why = etch.unknown.get(k, "its rate is 0")
        covers = f"film '{film.name}' ({film.material}), which covers the open area"
        raise StepError(f"depth: {covers}, is not etched by '{etch.settings.etchant}': {why}")
    return etch.rates[k]


def _open_columns(stack: FilmStack, targets: list[int]) -> np.ndarray:
    """Columns in which nothing but the targets is seen from above, `(ny, nx)` bool."""
    return np.isin(topmost(stack), targets)


def _isotropic_clear_time(etch: Etch, arrival: Arrival, films: list[int]) -> float:
    """When the last foot of the films is reached in the columns that nothing else covers, s."""
    seen = _open_columns(etch.stack, films)
    worst = 0.0
    for k in films:
        times = _foot_times(etch.stack, arrival, k, seen)
        if not len(times):
            return float("inf")
        worst = max(worst, float(times.max()))
    return worst


def _isotropic_expose_time(etch: Etch, arrival: Arrival, film: int) -> float:
    """When the film shows over 90 % of the area that no mask covers, s; inf if it never does."""
    etched = [k for k, rate in etch.rates.items() if rate > 0 and etch.stack.films[k].name != "resist"]
    seen = _open_columns(etch.stack, [*etched, film])
    shown = int(_open_columns(etch.stack, [film]).sum())
    over = (_foot_times(etch.stack, arrival, k, seen, film) for k in etched if k != film)
    times = np.sort(np.concatenate([np.zeros(shown), *over]))
    needed = int(np.ceil(EXPOSED * seen.sum()))
    return float(times[needed - 1]) if 0 < needed <= len(times) else float("inf")


def _foot_times(
    stack: FilmStack, arrival: Arrival, film: int, columns: np.ndarray, below: int = -1
) -> np.ndarray:
    """When the front is at the foot of a film, s, column by column; with `below` where it stands on that film."""
    t = stack.topology
    sample, times = fronts.foot_times(
        t.samples, t.strides, t.count, t.start, t.interval_code, t.interval_end, film, below, arrival.led_on(film)
    )
    _, ny, nx = t.code.shape
    y, x = (sample // nx) % ny, sample % nx
    inside = (y < columns.shape[0]) & (x < columns.shape[1])
    return np.asarray(times[inside][columns[y[inside], x[inside]]])


def _free_all_time(arrival: Arrival, parts: list[Part], wanted: tuple[str, ...]) -> float:
    by_name = {part.name: part for part in parts}
    worst = 0.0
    for name in wanted:
        if name not in by_name:
            raise StepError(f"frees: part '{name}' is not there")
        worst = max(worst, free_time(arrival, by_name[name]).time)
    return worst


def _contact_edges(t: Any) -> tuple[Any, ...]:
    return t.samples, t.code.reshape(-1), t.strides, t.count, t.start, t.interval_code


def free_time(arrival: Arrival, part: Part) -> Freed:
    """When nothing that the etch removes touches the part any more, and where that happens last; kept once found.

    Films far slower than the fastest, such as a nitride that an anchor stands on, do not count.
    """
    if part not in arrival.freed:
        arrival.freed[part] = _free_time(arrival, part)
    return arrival.freed[part]


def _free_time(arrival: Arrival, part: Part) -> Freed:
    stack, t = arrival.stack, arrival.stack.topology
    last, film, where = 0.0, None, None
    slowest = SLOWEST_SHARE * max(arrival.rates.values(), default=0.0)
    for k, rate in arrival.rates.items():
        if rate <= slowest or k in part.films:
            continue
        time, at = fronts.last_contact(
            *_contact_edges(t), t.piece, np.asarray(sorted(part.pieces), np.int64), k, arrival.at_samples(k),
            t.open_space.reshape(-1),
        )  # fmt: skip
        if at >= 0 and time > last:
            last, film = float(time), stack.films[k].name
            _, ny, nx = t.code.shape
            grid = stack.grid
            where = (
                float(grid.x[min(at % nx, grid.nx - 1)]),
                float(grid.y[min((at // nx) % ny, grid.ny - 1)]),
                float(grid.z[at // (ny * nx)]),
            )
    return Freed(part.name, last, film, where)
