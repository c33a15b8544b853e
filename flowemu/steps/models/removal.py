"""An etch or release carried out: rates, amount, what goes, and the record of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from flowemu.errors import StepError
from flowemu.flow.removal import OTHERS, RemovalSettings
from flowemu.kernels import fronts
from flowemu.stack.bodies import Part
from flowemu.stack.columns import thickness_map, topmost
from flowemu.stack.measure import film_volume
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Cut, Freed, Loss, Wafer
from flowemu.steps.models.directional import Beam
from flowemu.steps.models.isotropic import SLOWEST_SHARE, Arrival, arrive

MEANT_SHARE = 0.2  # without `clears`, films etched at this share of the fastest that was met are meant
TOUCHED = 1e-3  # um3; a smaller loss is rounding


@dataclass(frozen=True, eq=False)
class Etch:
    """One etch on one stack: settings with their data looked up.

    Attributes
    ----------
    rates : film number to um/s, 0 where the rate is known to be nothing or not known
    unknown : film number to why there is no rate
    """

    stack: FilmStack
    settings: RemovalSettings
    directional: bool
    wall: float
    lateral: float
    rates: dict[int, float]
    unknown: dict[int, str]

    @classmethod
    def of(cls, stack: FilmStack, settings: RemovalSettings, tools: Any) -> Etch:
        etchant = tools.etchant(settings.etchant)
        profile = settings.profile or etchant.profile
        if profile not in ("isotropic", "directional"):
            raise StepError(f"profile '{profile}' is not built yet; state profile: isotropic or directional")
        rates: dict[int, float] = {}
        unknown: dict[int, str] = {}
        for k, film in enumerate(stack.films):
            value, why = film_rate(film.name, film.material, film.state, settings, tools)
            rates[k] = value or 0.0
            if value is None:
                unknown[k] = why
        return cls(
            stack=stack,
            settings=settings,
            directional=profile == "directional",
            wall=settings.wall if settings.wall is not None else etchant.wall_angle,
            lateral=settings.lateral if settings.lateral is not None else etchant.lateral_share,
            rates=rates,
            unknown=unknown,
        )

    def numbers(self, names: tuple[str, ...]) -> list[int]:
        """Film numbers of named films, each of which must be there."""
        out = []
        for name in names:
            k = self.stack.index(name)
            if k is None:
                raise StepError(f"there is no film '{name}' on the wafer any more")
            out.append(k)
        return out


def film_rate(
    name: str, material: str, state: str | None, settings: RemovalSettings, tools: Any
) -> tuple[float | None, str]:
    """Rate of a film, um/s, and why there is none: the step's own, the data's, then the step's `others`."""
    for key in (name, material):
        if key in settings.rates:
            return settings.rates[key], ""
    datum = tools.rate(settings.etchant, material, state)
    if datum.value is not None:
        return float(datum.value), ""
    if OTHERS in settings.rates:
        return settings.rates[OTHERS], ""
    return None, datum.why_no_value


def carry_out(wafer: Wafer, settings: RemovalSettings, tools: Any, parts: list[Part] | None = None) -> Wafer:
    """The wafer after an etch or a release, with a `Cut` event that says what it took.

    Raises
    ------
    StepError
        A film that the etch meets has no rate; a film to clear is not there or is never cleared.
    """
    etch = Etch.of(wafer.stack, settings, tools)
    time, arrival = _etch_time(etch, parts or [])
    stack, first_times = _remove(etch, time, arrival)
    _refuse_unknown(etch, stack)
    losses = tuple(_losses(etch, stack, time, first_times))
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


def _etch_time(etch: Etch, parts: list[Part]) -> tuple[float, Arrival | None]:
    """How long the etch runs, s, and the arrival times where it is isotropic."""
    settings = etch.settings
    how, value = settings.stated_amount()
    if etch.directional:
        return _beam_time(etch, how, value), None
    if how == "time":
        return value, arrive(etch.stack, etch.rates, value)
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


def _remove(etch: Etch, time: float, arrival: Arrival | None) -> tuple[FilmStack, dict[int, float]]:
    """The stack after the etch and when each film was first reached, s."""
    if arrival is not None:
        first = {k: float(np.min(arrival.of_film(k)[1], initial=np.inf)) for k in etch.rates if etch.rates[k] > 0}
        return etch.stack.carve(arrival.removed(time)), first
    ray = Beam(etch.stack, etch.rates, etch.wall)
    first = ray.first_times(time)
    stack = etch.stack.carve(ray.removed(time))
    if etch.lateral > 0:
        names = {film.name: etch.rates[k] * etch.lateral for k, film in enumerate(etch.stack.films)}
        sideways = {k: names.get(film.name, 0.0) for k, film in enumerate(stack.films)}
        stack = stack.carve(arrive(stack, sideways, time).removed(time))
    return stack, first


def _refuse_unknown(etch: Etch, after: FilmStack) -> None:
    """Refuse the etch if a film without a rate lay bare to it before or after."""
    for stack in (etch.stack, after):
        t = stack.topology
        open_space = t.open_space.reshape(-1)
        for k, why in etch.unknown.items():
            film = etch.stack.films[k]
            here = next((i for i, f in enumerate(stack.films) if f.name == film.name and f.step == film.step), None)
            if here is None:
                continue
            bare = fronts.bare_voids(
                t.samples, t.code.reshape(-1), open_space, t.strides, t.count, t.start, t.interval_code, here
            )
            if bare.any():
                state = f", {film.state}" if film.state else ""
                agent = etch.settings.etchant
                raise StepError(
                    f"no rate for film '{film.name}' ({film.material}{state}) in '{agent}', which meets it: "
                    f"{why}; give one under rates, such as rates: {{{film.name}: 5 nm/min}}"
                )


def _losses(etch: Etch, after: FilmStack, time: float, first_times: dict[int, float]) -> list[Loss]:
    before = etch.stack
    how, value = etch.settings.stated_amount()
    named = set(value) if how == "clears" else set()
    met = [k for k, rate in etch.rates.items() if rate > 0 and first_times.get(k, np.inf) < time]
    fastest = max((etch.rates[k] for k in met), default=0.0)
    out = []
    for k in met:
        film = before.films[k]
        new = next((f for f in after.films if f.name == film.name and f.step == film.step), None)
        volume = film_volume(film, before.grid) - (film_volume(new, after.grid) if new is not None else 0.0)
        if volume <= TOUCHED:
            continue
        old_map = thickness_map(before, k)
        here = [i for i, f in enumerate(after.films) if f is new]
        new_map = thickness_map(after, here[0]) if here else np.zeros_like(old_map)
        usual = float(np.median(old_map[old_map > 0])) if (old_map > 0).any() else 0.0
        lost = old_map - new_map
        iy, ix = (int(i) for i in np.unravel_index(int(np.argmax(lost)), lost.shape))
        through = bool(((old_map > 0.5 * usual) & (new_map <= 1e-6)).sum() > 2)
        meant = film.name in named or film.name == "resist" or (not named and etch.rates[k] >= MEANT_SHARE * fastest)
        top = _top_at(before, k, iy, ix)
        out.append(
            Loss(film.name, film.material, etch.rates[k], etch.rates[k] * (time - first_times[k]), usual, volume, meant,
                 through, (float(before.grid.x[ix]), float(before.grid.y[iy]), top))
        )  # fmt: skip
    return out


def _top_at(stack: FilmStack, k: int, iy: int, ix: int) -> float:
    inside = np.flatnonzero(stack.topology.code[:, iy, ix] == k)
    return float(stack.grid.z[inside[-1]]) if len(inside) else 0.0


def _open_columns(stack: FilmStack, targets: list[int]) -> np.ndarray:
    """Columns in which nothing but the targets is seen from above, `(ny, nx)` bool."""
    return np.isin(topmost(stack), targets)


def _isotropic_clear_time(etch: Etch, arrival: Arrival, films: list[int]) -> float:
    t = etch.stack.topology
    _, ny, nx = t.code.shape
    open_columns = _open_columns(etch.stack, films)
    seen = np.zeros((ny, nx), bool)
    seen[: open_columns.shape[0], : open_columns.shape[1]] = open_columns
    worst = 0.0
    for k in films:
        sample, times = arrival.of_film(k)
        mine = seen.reshape(-1)[sample % (ny * nx)]
        if not mine.any():
            return float("inf")
        worst = max(worst, float(times[mine].max()))
    return worst


def _isotropic_expose_time(etch: Etch, arrival: Arrival, film: int) -> float:
    t = etch.stack.topology
    times = np.sort(fronts.contact_times(*_contact_edges(t), film, _dense(arrival, t), t.open_space.reshape(-1)))
    if len(times) == 0:
        return float("inf")
    return float(times[min(int(0.9 * len(times)), len(times) - 1)])


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


def _dense(arrival: Arrival, t: Any) -> np.ndarray:
    """Earliest arrival of any front at every sample, flat, s."""
    out = np.full(t.code.size, np.inf)
    for front in arrival.fronts:
        np.minimum.at(out, front.nodes.sample, front.time)
    return out


def free_time(arrival: Arrival, part: Part) -> Freed:
    """When nothing that the etch removes touches the part any more, and where that happens last.

    Films far slower than the fastest, such as a nitride that an anchor stands on, do not count.
    """
    stack, t = arrival.stack, arrival.stack.topology
    last, film, where = 0.0, None, None
    slowest = SLOWEST_SHARE * max(arrival.rates.values(), default=0.0)
    for k, rate in arrival.rates.items():
        if rate <= slowest or k in part.films:
            continue
        sample, times = arrival.of_film(k)
        dense = np.full(t.code.size, np.inf)
        dense[sample] = times
        time, at = fronts.last_contact(
            *_contact_edges(t), t.piece, np.asarray(sorted(part.pieces), np.int64), k, dense, t.open_space.reshape(-1)
        )
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
