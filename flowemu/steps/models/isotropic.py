"""Isotropic etching: when the front reaches each film, and what is gone by a given time."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from flowemu.kernels import faces, fronts, starts, surface
from flowemu.kernels.march import arrival_on_graph
from flowemu.stack.removed import complete
from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology

MOST_CROSSINGS = 12  # times that a front may pass from one film into another of the same group
SLOWEST_SHARE = 1 / 50  # films slower than this share of the fastest get a front of their own


@dataclass(frozen=True, eq=False)
class Nodes:
    """(sample, film) pairs that a front can be at; see `kernels.fronts`."""

    sample: np.ndarray
    film: np.ndarray
    own: np.ndarray
    keys: np.ndarray
    first_thin: int
    place: np.ndarray
    neighbours: np.ndarray
    stage: np.ndarray

    @classmethod
    def of(cls, topology: Topology, films: list[int]) -> Nodes:
        grid, code = topology.grid, topology.code.reshape(-1)
        stage = np.zeros(len(topology.fields.top), np.uint8)
        stage[films] = 1
        etched = np.isin(topology.code, np.array(films, np.int16)).reshape(-1)
        sample = np.flatnonzero(etched)
        own = np.full(code.size, -1, np.int32)
        own[sample] = np.arange(len(sample), dtype=np.int32)
        open_space = topology.open_space.reshape(-1)
        thin_sample, thin_film, thin_place = fronts.thin_nodes(
            topology.samples, code, stage, open_space, topology.strides, topology.code.shape, topology.count,
            topology.start, topology.interval_code, topology.interval_end, grid.z, grid.cell, grid.cell,
        )  # fmt: skip
        keys, first = np.unique(thin_sample * len(stage) + thin_film, return_index=True)
        _, ny, nx = topology.code.shape
        place = np.empty((len(sample) + len(keys), 3), np.float32)
        place[: len(sample), 0] = (sample % nx) * grid.cell
        place[: len(sample), 1] = ((sample // nx) % ny) * grid.cell
        place[: len(sample), 2] = grid.z[sample // (ny * nx)]
        place[len(sample) :] = thin_place[first]
        node_sample = np.concatenate([sample, thin_sample[first]])
        node_film = np.concatenate([code[sample].astype(np.int64), thin_film[first]])
        neighbours = fronts.link(
            node_sample, node_film, own, keys, len(sample), code, len(stage), topology.code.shape, topology.row_of
        )  # fmt: skip
        return cls(node_sample, node_film, own, keys, len(sample), place, neighbours, stage)


@dataclass(frozen=True, eq=False)
class Front:
    """Arrival times of one group of films, s since the etch began, inf where never reached.

    `beyond` is how much farther, um, the front has to go from a node's place to its sample.
    """

    nodes: Nodes
    time: np.ndarray
    beyond: np.ndarray
    slowness: np.ndarray


@dataclass(frozen=True, eq=False)
class Arrival:
    """Arrival times of an etch in all films that it etches, by groups of like rate."""

    stack: FilmStack
    rates: Mapping[int, float]
    fronts: tuple[Front, ...]

    def of_film(self, k: int) -> tuple[np.ndarray, np.ndarray]:
        """Flat sample numbers (of the topology) and times of film `k`'s nodes."""
        for front in self.fronts:
            if front.nodes.stage[k]:
                mine = front.nodes.film == k
                return front.nodes.sample[mine], front.time[mine]
        return np.empty(0, np.int64), np.empty(0, np.float32)

    def _beyond(self, k: int) -> np.ndarray:
        front = next(front for front in self.fronts if front.nodes.stage[k])
        return front.beyond[front.nodes.film == k]

    def removed(self, time: float) -> dict[int, np.ndarray]:
        """Removed field of each etched film after `time` s, `(nz, ny, nx)` float32 um."""
        return {k: self._removed_film(k, rate, time) for k, rate in self.rates.items() if rate > 0 and time > 0}

    def _removed_film(self, k: int, rate: float, time: float) -> np.ndarray:
        stack, topology = self.stack, self.stack.topology
        band = np.float32(stack.band)
        value = np.full(topology.code.size, -band, np.float32)
        known = np.zeros(topology.code.size, bool)
        sample, times = self.of_film(k)
        value[sample] = np.maximum((time - times) * rate - self._beyond(k), -band)
        known[sample] = True
        open_space = topology.open_space.reshape(-1)
        bare = fronts.bare_voids(
            topology.samples, topology.code.reshape(-1), open_space, topology.strides, topology.count, topology.start,
            topology.interval_code, k,
        )  # fmt: skip
        if bare.any():
            outside = distance_outside(stack, topology, k)
            value[bare] = time * rate + outside[bare]
            known |= bare
        return complete(stack, value, known, settled=True)


def distance_outside(stack: FilmStack, topology: Topology, k: int) -> np.ndarray:
    """Distance of void samples from film `k`, flat over the topology's samples, at most the band."""
    fields = topology.fields
    shape = topology.code.shape

    def of(column: int) -> np.ndarray:
        return fields.arrays[max(column, 0)].reshape(shape)

    out = np.full(shape, np.float32(stack.band), np.float32)
    grid = stack.grid
    surface.lower_to_film(
        out, topology.code, of(fields.top[k]), of(fields.floor[k]), of(fields.gone[k]),
        bool(fields.floor[k] >= 0), bool(fields.gone[k] >= 0), grid.z, grid.cell, grid.cell, np.float32(stack.band),
        1.0,
    )  # fmt: skip
    return out.reshape(-1)


def groups_by_rate(rates: Mapping[int, float]) -> list[list[int]]:
    """Films with a rate above zero, fastest first, in groups within a factor of fifty."""
    groups: list[list[int]] = []
    for k in sorted((k for k in rates if rates[k] > 0), key=lambda k: (-rates[k], k)):
        if groups and rates[k] >= SLOWEST_SHARE * rates[groups[-1][0]]:
            groups[-1].append(k)
        else:
            groups.append([k])
    return groups


def arrive(stack: FilmStack, rates: Mapping[int, float], limit: float = np.inf) -> Arrival:
    """Arrival times of an isotropic etch from the open space.

    Parameters
    ----------
    rates : film number to um/s; films left out or at 0 are not etched
    limit : s; fronts are followed a few cells beyond where they are by then
    """
    done: list[Front] = []
    for group in groups_by_rate(rates):
        nodes = Nodes.of(stack.topology, group)
        slowness = (1.0 / np.array([rates.get(k) or 1.0 for k in range(len(stack.films))]))[nodes.film]
        reach = limit + 1.5 * stack.band * float(np.max(slowness, initial=0.0))
        mine = Front(nodes, np.full(len(nodes.sample), np.inf), np.zeros(len(nodes.sample)), slowness)
        _start_from_void(stack, mine)
        exact = np.isfinite(mine.time)
        for front in done:
            Passage(stack, nodes, front.nodes).start(mine, front)
        mine = _march(stack, mine, np.where(exact, np.inf, slowness), reach)
        passage = Passage(stack, nodes, nodes)
        for _ in range(MOST_CROSSINGS if len(group) > 1 else 0):
            again = Front(nodes, mine.time.copy(), mine.beyond.copy(), slowness)
            passage.start(again, mine)
            sooner = again.time < mine.time - 0.02 * stack.grid.cell * slowness
            if not sooner.any():
                break
            mine = _march(stack, again, np.where(exact | sooner, np.inf, slowness), reach)
        done.append(mine)
    return Arrival(stack, dict(rates), tuple(done))


def _march(stack: FilmStack, front: Front, slowness: np.ndarray, limit: float) -> Front:
    """The front marched on; nodes of infinite slowness keep their times."""
    _, ny, nx = stack.topology.code.shape
    nodes, cell = front.nodes, stack.grid.cell
    zi = nodes.sample // (ny * nx)
    time = arrival_on_graph(
        front.time, slowness.astype(np.float32), nodes.neighbours, zi, cell, cell, stack.grid.z, limit
    )
    return Front(nodes, np.asarray(time, np.float64), front.beyond, front.slowness)


@dataclass(frozen=True, eq=False)
class Faces:
    """Bare triangles of the films that a front etches, `(n, 3, 3)` um, cell after cell of `cells` from `first`.

    `box (cells, 6)` lies round them, `partly (cells,)` marks the cells in which a bare surface ends.
    """

    triangles: np.ndarray
    films: np.ndarray
    cells: np.ndarray
    first: np.ndarray
    box: np.ndarray
    partly: np.ndarray

    @classmethod
    def of(cls, stack: FilmStack, nodes: Nodes, source: np.ndarray) -> Faces:
        t, grid = stack.topology, stack.grid
        f, code = t.fields, t.code.reshape(-1)
        is_open = np.zeros(len(t.piece), np.uint8)
        is_open[t.open_roots] = 1
        triangles, films, number, partly = faces.bare_triangles(
            t.cells, t.corner_offsets, t.code.shape, t.row_of, t.values, code, t.count, t.start, t.interval_code,
            f.top, f.floor, f.gone, nodes.stage, source, is_open, t.piece, grid.z, grid.cell, grid.cell,
        )  # fmt: skip
        bare = np.flatnonzero(number)
        cells, partly = t.cells[bare], partly[bare]
        numbers = _numbered(cells, code.size)
        starts.mark_ends(cells, numbers, t.is_mixed, code, t.corner_offsets, nodes.stage, t.strides, partly)
        first = np.concatenate([[0], np.cumsum(number[bare])])
        return cls(triangles, films, cells, first, starts.boxes(triangles, first), partly)


def _numbered(cells: np.ndarray, size: int, chosen: np.ndarray | None = None) -> np.ndarray:
    """Number of every cell, or of the chosen ones, by its flat place, `(size,)` int32, -1 elsewhere."""
    out = np.full(size, -1, np.int32)
    chosen = np.arange(len(cells)) if chosen is None else chosen
    out[cells[chosen]] = chosen
    return out


def _start(stack: FilmStack, front: Front, found: Faces, base: np.ndarray, chosen: np.ndarray) -> None:
    """Lower the front's times (its own arrays) near the faces in the chosen cells."""
    if not len(chosen):
        return
    t, grid, nodes = stack.topology, stack.grid, front.nodes
    reach = starts.sample_reach(found.cells[chosen], found.partly[chosen], t.code.shape)[nodes.sample]
    listed = np.flatnonzero(reach >= 0)
    starts.nearest_starts(
        listed, nodes.sample, nodes.film, nodes.place, reach[listed], _numbered(found.cells, t.code.size, chosen),
        found.box, found.first, found.triangles, found.films, base, np.minimum.reduceat(base, found.first[:-1]),
        front.slowness, t.code.reshape(-1), t.is_mixed, t.row_of, t.values, t.fields.top, t.fields.floor,
        t.fields.gone, t.code.shape, grid.z, grid.cell, grid.cell, front.time, front.beyond,
    )  # fmt: skip


def _start_from_void(stack: FilmStack, front: Front) -> None:
    source = np.zeros(2 * (len(stack.films) + 1) + 1, np.uint8)
    found = Faces.of(stack, front.nodes, source)
    _start(stack, front, found, np.zeros(len(found.films)), np.arange(len(found.cells)))


class Passage:
    """Where an earlier front, or the same one, passes through the faces between films into a front's nodes."""

    def __init__(self, stack: FilmStack, nodes: Nodes, earlier: Nodes) -> None:
        self.stack, self.nodes = stack, nodes
        films = len(stack.films)
        self.source = np.zeros(2 * (films + 1) + 1, np.uint8)
        self.source[films + 1 :][:films][earlier.stage > 0] = 1
        self.before = np.full(len(earlier.sample), np.inf)

    @cached_property
    def faces(self) -> Faces:
        return Faces.of(self.stack, self.nodes, self.source)

    @cached_property
    def base(self) -> np.ndarray:
        """When the earlier front gets to each triangle, as far as it is known, s."""
        return np.full(len(self.faces.films), np.inf)

    def start(self, front: Front, earlier: Front) -> None:
        """Lower the front's times by what the earlier front has reached since the last call."""
        t, grid, found = self.stack.topology, self.stack.grid, self.faces
        old = self.base.copy()
        starts.face_times(
            self.base, found.triangles, found.first, found.cells, t.corner_offsets, t.code.shape, t.code.reshape(-1),
            self.source, earlier.nodes.own, earlier.time, self.before, earlier.slowness, grid.z, grid.cell, grid.cell,
        )  # fmt: skip
        self.before = earlier.time.copy()
        sooner = np.add.reduceat(self.base < old, found.first[:-1]) if len(old) else np.empty(0, bool)
        _start(self.stack, front, found, self.base, np.flatnonzero(sooner))
