"""What an etch took: how much of each film, where most, and whether that was meant."""

from __future__ import annotations

import numpy as np

from flowemu.stack.columns import thickness_maps
from flowemu.stack.film import Film
from flowemu.stack.measure import film_volume
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Loss
from flowemu.steps.models.recipe import Etch

MEANT_SHARE = 0.2  # without `clears`, films etched at this share of the fastest that was met are meant
TOUCHED = 1e-3  # um3; a smaller loss is rounding


def losses_of(etch: Etch, after: FilmStack, time: float, first_times: dict[int, float]) -> list[Loss]:
    """What each film lost that the etch met before `time`; films that lost nothing are left out."""
    before = etch.stack
    met = [k for k, rate in etch.rates.items() if rate > 0 and first_times.get(k, np.inf) < time]
    volumes = {k: _volume_lost(before, after, k) for k in met}
    lost = [k for k in met if volumes[k] > TOUCHED]
    if not lost:
        return []
    meant = _meant(etch, met)
    old_maps, new_maps = thickness_maps(before), thickness_maps(after)
    out = []
    for k in lost:
        film, rate, left = before.films[k], etch.rates[k], number_after(before.films[k], after)
        old = old_maps[k]
        new = np.zeros_like(old) if left is None else new_maps[left]
        usual = float(np.median(old[old > 0])) if (old > 0).any() else 0.0
        through = bool(((old > 0.5 * usual) & (new <= 1e-6)).sum() > 2)
        at = _top_at(before, k, *np.unravel_index(int(np.argmax(old - new)), old.shape))
        reach = rate * (time - first_times[k])
        out.append(Loss(film.name, film.material, rate, reach, usual, volumes[k], k in meant, through, at))
    return out


def number_after(film: Film, after: FilmStack) -> int | None:
    """Number of what is left of a film, None if it is gone."""
    return next((i for i, f in enumerate(after.films) if f.name == film.name and f.step == film.step), None)


def _volume_lost(before: FilmStack, after: FilmStack, k: int) -> float:
    """Volume that film `k` lost, um3."""
    film, left = before.films[k], number_after(before.films[k], after)
    if left is not None and after.films[left] is film:
        return 0.0
    kept = 0.0 if left is None else film_volume(after.films[left], after.grid)
    return film_volume(film, before.grid) - kept


def _meant(etch: Etch, met: list[int]) -> set[int]:
    """Films of those met that the etch is there to take: those it clears, resist, else what goes fast."""
    how, value = etch.settings.stated_amount()
    named = set(value) if how == "clears" else set()
    fastest = max((etch.rates[k] for k in met), default=0.0)
    fast = {k for k in met if not named and etch.rates[k] >= MEANT_SHARE * fastest}
    return fast | {k for k in met if etch.stack.films[k].name in named | {"resist"}}


def _top_at(stack: FilmStack, k: int, iy: np.intp, ix: np.intp) -> tuple[float, float, float]:
    """The column's place and the height of its topmost sample in film `k` (0 if none), um."""
    grid = stack.grid
    inside = np.flatnonzero(stack.topology.code[:, iy, ix] == k)
    return float(grid.x[ix]), float(grid.y[iy]), float(grid.z[inside[-1]]) if len(inside) else 0.0
