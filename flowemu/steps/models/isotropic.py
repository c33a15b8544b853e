"""Isotropic etching: when the front reaches each film, and what is gone by a given time."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from flowemu.kernels import fronts, surface
from flowemu.kernels.carry import carried
from flowemu.stack.bodies import Part
from flowemu.stack.removed import complete, farthest
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology
from flowemu.stack.wafer import Freed
from flowemu.steps.models.media import Front, Nodes, groups_by_rate, media_of
from flowemu.steps.models.passage import Passage, beside_thin, marched, start_from_void

MOST_CROSSINGS = 12  # times that a front may pass from one film into another of the same group


@dataclass(frozen=True, eq=False)
class Arrival:
    """Arrival times of an etch in all films that it etches, by groups of like rate."""

    stack: FilmStack
    rates: Mapping[int, float]
    fronts: tuple[Front, ...]

    def front_of(self, k: int) -> Front | None:
        """The front that etches film `k`."""
        return next((front for front in self.fronts if front.nodes.stage[k]), None)

    def of_film(self, k: int) -> tuple[np.ndarray, np.ndarray]:
        """Flat sample numbers (of the topology) and times of film `k`'s nodes."""
        front = self.front_of(k)
        if front is None:
            return np.empty(0, np.int64), np.empty(0, np.float32)
        mine = front.nodes.film == k
        return front.nodes.sample[mine], front.time[mine]

    def at_samples(self, k: int) -> np.ndarray:
        """Times of film `k`'s nodes at their samples, flat float32, inf elsewhere; kept once made."""
        if k not in self._kept:
            self._kept[k] = np.full(self.stack.topology.code.size, np.inf, np.float32)
            sample, times = self.of_film(k)
            self._kept[k][sample] = times
        return self._kept[k]

    def led_on(self, k: int) -> np.ndarray:
        """Times of film `k` at its samples and one beyond them, flat float32 s, inf elsewhere."""
        t, front, rate = self.stack.topology, self.front_of(k), self.rates.get(k, 0.0)
        out = np.full(t.code.shape, np.float32(np.inf))
        if front is None:
            return out.reshape(-1)
        mine = np.flatnonzero((front.nodes.film == k) & np.isfinite(front.time))
        known = np.zeros(t.code.size, bool)
        known[front.nodes.sample[mine]] = True
        out.reshape(-1)[front.nodes.sample[mine]] = front.time[mine] * rate + front.beyond[mine]
        carried(out, known.reshape(t.code.shape), self.stack.grid.z, self.stack.grid.cell, 1)
        return out.reshape(-1) / np.float32(rate)

    @cached_property
    def freed(self) -> dict[Part, Freed]:
        """When parts come free, as far as that was asked for."""
        return {}

    @cached_property
    def _kept(self) -> dict[int, np.ndarray]:
        return {}

    def removed(self, time: float) -> dict[int, np.ndarray | None]:
        """Removed field of each film reached in `time` s, `(nz, ny, nx)` float32 um; None if it is gone whole."""
        return dict(self._removed_films(time)) if time > 0 else {}

    def _removed_films(self, time: float) -> Iterator[tuple[int, np.ndarray | None]]:
        t = self.stack.topology
        for k, rate in self.rates.items():
            front = self.front_of(k)
            if front is None:
                continue
            mine = np.flatnonzero(front.nodes.film == k)
            depth = (time - front.time[mine]) * rate - front.beyond[mine]
            bare = fronts.bare_voids(
                t.samples, t.code.reshape(-1), t.open_space.reshape(-1), t.strides, t.count, t.start, t.interval_code, k
            )
            if k > 0 and depth.min(initial=np.inf) >= farthest(self.stack):
                yield k, None
            elif bare.any() or depth.max(initial=-np.inf) > -farthest(self.stack):
                yield k, self._removed_film(k, front.nodes.sample[mine], depth, bare, time * rate)

    def _removed_film(
        self, k: int, sample: np.ndarray, depth: np.ndarray, bare: np.ndarray, reach: float
    ) -> np.ndarray:
        """From how deep a film's nodes lie in what is gone, and the open void's samples beside it."""
        stack, t = self.stack, self.stack.topology
        value = np.full(t.code.size, -np.float32(stack.band), np.float32)
        value[sample] = np.maximum(depth, -stack.band)
        if bare.any():
            value[bare] = reach + distance_outside(stack, t, k)[bare]
        known = bare
        known[sample] = True
        return complete(stack, value, known, front=True)


def distance_outside(stack: FilmStack, topology: Topology, k: int) -> np.ndarray:
    """Distance of void samples from film `k`, flat over the topology's samples, at most the band."""
    fields, grid = topology.fields, stack.grid
    shape, band = topology.code.shape, np.float32(stack.band)

    def of(column: int) -> np.ndarray:
        return fields.arrays[max(column, 0)].reshape(shape)

    out = np.full(shape, band, np.float32)
    surface.lower_to_film(
        out, topology.code, of(fields.top[k]), of(fields.floor[k]), of(fields.gone[k]),
        bool(fields.floor[k] >= 0), bool(fields.gone[k] >= 0), grid.z, grid.cell, grid.cell, band, 1.0,
    )  # fmt: skip
    return out.reshape(-1)


def arrive(stack: FilmStack, rates: Mapping[int, float], limit: float = np.inf) -> Arrival:
    """Arrival times of an isotropic etch from the open space.

    While one group's front is marched, in a thread that lets go of the interpreter's lock, the next one is begun.

    Parameters
    ----------
    rates : film number to um/s; films left out or at 0 are not etched
    limit : s; fronts are followed a few cells beyond where they are by then
    """
    groups = groups_by_rate(rates)
    done: list[Front] = []
    with ThreadPoolExecutor(1) as worker:
        begun = _begin(stack, rates, groups[0], []) if groups else None
        for following in [*groups[1:], None]:
            if begun is None:
                break
            front, passages = begun
            exact = np.isfinite(front.time)
            for passage, earlier in zip(passages, done, strict=True):
                passage.start(front, earlier)
            reach = limit + 1.5 * stack.band * float(np.max(front.slowness, initial=0.0))
            marching = worker.submit(marched, stack, front, np.where(exact, np.inf, front.slowness), reach)
            before = [*(earlier.nodes for earlier in done), front.nodes]
            begun = _begin(stack, rates, following, before) if following else None
            done.append(_to_and_fro(stack, marching.result(), exact, reach))
    return Arrival(stack, dict(rates), tuple(done))


def _begin(
    stack: FilmStack, rates: Mapping[int, float], group: list[int], before: list[Nodes]
) -> tuple[Front, list[Passage]]:
    """A group's front where it starts from the void, and the faces that fronts at the nodes before it come through."""
    nodes = Nodes.of(stack.topology, group, media_of(rates, group, len(stack.films)))
    slowness = (1.0 / np.array([rates.get(k) or 1.0 for k in range(len(stack.films))]))[nodes.film]
    front = Front(nodes, np.full(len(nodes.sample), np.inf), np.zeros(len(nodes.sample)), slowness)
    start_from_void(stack, front)
    return front, [Passage(stack, nodes, earlier) for earlier in before]


def _to_and_fro(stack: FilmStack, front: Front, exact: np.ndarray, reach: float) -> Front:
    """A front that passes on from film to film of its own group until none of them is reached sooner."""
    nodes, slowness = front.nodes, front.slowness
    if np.sum(nodes.stage) == 1:
        return front
    one_rate = len(np.unique(nodes.medium[nodes.stage > 0])) == 1
    passage = Passage(stack, nodes, nodes, beside_thin(stack, nodes) if one_rate else None)
    for _ in range(MOST_CROSSINGS):
        again = Front(nodes, front.time.copy(), front.beyond.copy(), slowness)
        passage.start(again, front)
        sooner = again.time < front.time - 0.02 * stack.grid.cell * slowness
        if not sooner.any():
            break
        front = marched(stack, again, np.where(exact | sooner, np.inf, slowness), reach, np.flatnonzero(sooner))
    return front
