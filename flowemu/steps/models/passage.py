"""How a front gets into its media: from the void and from other media, through their faces, and on from there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from flowemu.kernels import contents, faces, plain, starts
from flowemu.kernels.march import arrival_on_graph
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.media import Front, Nodes


def marched(
    stack: FilmStack, front: Front, slowness: np.ndarray, limit: float, seeds: np.ndarray | None = None
) -> Front:
    """The front marched on from all its times, or from the nodes `seeds`; nodes of infinite slowness keep theirs."""
    _, ny, nx = stack.topology.code.shape
    nodes, cell = front.nodes, stack.grid.cell
    zi = nodes.sample // (ny * nx)
    time = arrival_on_graph(
        front.time, slowness.astype(np.float32), nodes.neighbours, zi, cell, cell, stack.grid.z, limit, seeds
    )
    return Front(nodes, np.asarray(time, np.float64), front.beyond, front.slowness)


@dataclass(frozen=True, eq=False)
class Faces:
    """Bare triangles of the films that a front etches, `(n, 3, 3)` um, cell after cell of `cells` from `first`.

    `films` and `outer (n,)` are the codes on either side of each, `box (cells, 6)` lies round a cell's triangles, and
    `partly (cells,)` marks the cells in which a bare surface ends.
    """

    triangles: np.ndarray
    films: np.ndarray
    outer: np.ndarray
    cells: np.ndarray
    first: np.ndarray
    box: np.ndarray
    partly: np.ndarray

    @classmethod
    def of(cls, stack: FilmStack, stage: np.ndarray, source: np.ndarray, chosen: np.ndarray) -> Faces:
        """The faces of staged films that lie bare to what `source` marks, in the chosen ones of the mixed cells."""
        t, grid, f = stack.topology, stack.grid, stack.topology.fields
        within = t.cells[chosen]
        triangles, films, outer, number, partly = faces.bare_triangles(
            within, t.contents[chosen], t.corner_offsets, t.code.shape, t.row_of, t.values, t.code.reshape(-1),
            t.count, t.start, t.interval_code, f.top, f.floor, f.gone, stage, source, t.is_open, t.piece, grid.z,
            grid.cell, grid.cell,
        )  # fmt: skip
        bare = np.flatnonzero(number)
        first = np.concatenate([[0], np.cumsum(number[bare])])
        return cls(triangles, films, outer, within[bare], first, starts.boxes(triangles, first), partly[bare])

    def mark_ends(self, stack: FilmStack, nodes: Nodes, more: np.ndarray) -> None:
        """Mark as partly bare the cells beside which the bare surface ends; it goes on into the cells `more`."""
        t = stack.topology
        with t.numbered(np.concatenate([self.cells, more])) as numbers:
            starts.mark_ends(
                self.cells, numbers, t.is_mixed, t.code.reshape(-1), t.corner_offsets, nodes.stage, t.strides,
                self.partly,
            )  # fmt: skip


def cells_with_faces(stack: FilmStack, k: int) -> np.ndarray:
    """Flat numbers of the cells in which film `k` lies bare to the open space."""
    stage, source = np.zeros(len(stack.films), np.uint8), np.zeros(2 * (len(stack.films) + 1) + 1, np.uint8)
    stage[k] = 1
    t = stack.topology
    return Faces.of(stack, stage, source, contents.cells_between(t.contents, stage, source)).cells


def _start(stack: FilmStack, front: Front, found: Faces, base: np.ndarray, chosen: np.ndarray) -> None:
    """Lower the front's times (its own arrays) near the faces in the chosen cells."""
    if not len(chosen):
        return
    t, grid, nodes = stack.topology, stack.grid, front.nodes
    reach = starts.sample_reach(found.cells[chosen], found.partly[chosen], t.code.shape)[nodes.sample]
    listed = np.flatnonzero(reach >= 0)
    least = np.minimum.reduceat(base.min(axis=1), found.first[:-1])
    with t.numbered(found.cells[chosen], chosen) as numbers:
        starts.nearest_starts(
            listed, nodes.sample, nodes.film, nodes.place, reach[listed], numbers, found.box, found.first,
            found.triangles, found.films, base, least, front.slowness, nodes.medium, t.code.reshape(-1), t.is_mixed,
            t.row_of, t.values, t.fields.top, t.fields.floor, t.fields.gone, t.code.shape, grid.z, grid.cell,
            grid.cell, front.time, front.beyond,
        )  # fmt: skip


def start_from_void(stack: FilmStack, front: Front) -> None:
    """Lower the front's times (its own arrays) near the faces that lie bare to the open space."""
    t = stack.topology
    source = np.zeros(2 * (len(stack.films) + 1) + 1, np.uint8)
    between = contents.cells_between(t.contents, front.nodes.stage, source)
    cells = t.cells[between]
    quiet = _start_from_fields(stack, front, cells, t.contents[between])
    found = Faces.of(stack, front.nodes.stage, source, between[~quiet])
    found.mark_ends(stack, front.nodes, cells[quiet])
    _start(stack, front, found, np.zeros((len(found.films), 3)), np.arange(len(found.cells)))


def _start_from_fields(stack: FilmStack, front: Front, cells: np.ndarray, found: np.ndarray) -> np.ndarray:
    """Lower the times in those of the cells that lie far from all but smooth faces; which they are, bool."""
    t, f, nodes, code = stack.topology, stack.topology.fields, front.nodes, stack.topology.code.reshape(-1)
    field = plain.plain_fields(
        cells, found, t.corner_offsets, t.row_of, t.values, code, f.top, f.floor, f.gone, nodes.stage, t.is_open,
        t.piece,
    )  # fmt: skip
    ends = (field < 0).astype(np.uint8)
    with t.numbered(cells) as numbers:
        starts.mark_ends(cells, numbers, t.is_mixed, code, t.corner_offsets, nodes.stage, t.strides, ends)
    near = np.zeros(code.size, bool)
    plain.mark_around(cells[ends > 0], t.code.shape, starts.FAR + 1, near)
    quiet = ~near[cells]
    for k in np.unique(field[quiet]):
        plain.field_starts(
            cells[quiet & (field == k)], f.arrays[k].reshape(-1), code, nodes.own, front.slowness, t.code.shape,
            front.time,
        )  # fmt: skip
    return quiet


def beside_thin(stack: FilmStack, nodes: Nodes) -> np.ndarray:
    """Which mixed cells have a node of a thin film at one of their corners, bool."""
    t = stack.topology
    thin = np.zeros(t.code.size, bool)
    thin[nodes.sample[nodes.first_thin :]] = True
    found = np.zeros(len(t.cells), bool)
    for offset in t.corner_offsets:
        found |= thin[t.cells + offset]
    return found


class Passage:
    """Where an earlier front, or the same one, passes through the faces between films into a front's nodes.

    With `thin (cells,)` only the faces in the mixed cells marked by it count, and no surface is taken to end there, so
    that only nodes beside a face start from it.
    """

    def __init__(self, stack: FilmStack, nodes: Nodes, earlier: Nodes, thin: np.ndarray | None = None) -> None:
        self.stack, self.nodes, self.thin = stack, nodes, thin
        films = len(stack.films)
        self.source = np.zeros(2 * (films + 1) + 1, np.uint8)
        self.source[films + 1 :][:films][earlier.stage > 0] = 1
        self.before = np.full(len(earlier.sample), np.inf)
        self.faces = self._faces()
        self.base = np.full((len(self.faces.films), 3), np.inf)  # s, when the earlier front gets to triangles' corners

    def _faces(self) -> Faces:
        t = self.stack.topology
        chosen = contents.cells_between(t.contents, self.nodes.stage, self.source)
        if self.thin is not None:
            return Faces.of(self.stack, self.nodes.stage, self.source, chosen[self.thin[chosen]])
        found = Faces.of(self.stack, self.nodes.stage, self.source, chosen)
        found.mark_ends(self.stack, self.nodes, found.cells)
        return found

    def start(self, front: Front, earlier: Front) -> None:
        """Lower the front's times by what the earlier front has reached since the last call."""
        t, found, nodes = self.stack.topology, self.faces, earlier.nodes
        old = self.base.copy()
        starts.face_times(
            self.base, found.triangles, found.outer, found.first, found.cells, t.corner_offsets, t.code.reshape(-1),
            nodes.own, nodes.keys, nodes.first_thin, len(nodes.stage), nodes.place, earlier.time, self.before,
            earlier.slowness,
        )  # fmt: skip
        self.before = earlier.time.copy()
        if len(old):
            sooner = np.logical_or.reduceat((self.base < old).any(axis=1), found.first[:-1])
            _start(self.stack, front, found, self.base, np.flatnonzero(sooner))
