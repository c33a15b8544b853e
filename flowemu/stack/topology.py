"""What hangs together in a film stack: pieces of film, bodies, voids and what is open."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from flowemu.kernels import contents, joins, regions
from flowemu.stack.film import Film
from flowemu.stack.grid import Grid


def film_codes(films: Sequence[Film], shape: tuple[int, int, int]) -> np.ndarray:
    """The code of every sample, `shape` int16 (see `kernels.regions`)."""
    code = np.full(shape, -1, np.int16)
    flat = code.reshape(-1)
    for k, film in enumerate(films):
        top = film.top.reshape(-1)
        floor = top if film.floor is None else film.floor.reshape(-1)
        gone = top if film.gone is None else film.gone.reshape(-1)
        regions.paint(flat, top, floor, gone, film.floor is not None, film.gone is not None, k)
    return code


@dataclass(frozen=True, eq=False)
class FieldTable:
    """The distinct fields of a stack and which of them bound which film."""

    arrays: tuple[np.ndarray, ...]
    top: np.ndarray
    floor: np.ndarray
    gone: np.ndarray

    @classmethod
    def of(cls, films: Sequence[Film]) -> FieldTable:
        column: dict[int, int] = {}
        arrays: list[np.ndarray] = []

        def index(array: np.ndarray | None) -> int:
            if array is None:
                return -1
            if id(array) not in column:
                column[id(array)] = len(arrays)
                arrays.append(array)
            return column[id(array)]

        rows = [(index(f.top), index(f.floor), index(f.gone)) for f in films]
        table = np.array(rows, np.int64).reshape(-1, 3)
        return cls(tuple(arrays), *(np.ascontiguousarray(table[:, c]) for c in range(3)))

    def gather(self, samples: np.ndarray) -> np.ndarray:
        """Values of all fields at flat sample numbers, `(len(samples), fields)` float32."""
        values = np.empty((len(samples), len(self.arrays)), np.float32)
        flat = [np.ascontiguousarray(array).reshape(-1) for array in self.arrays]
        for column in range(0, len(flat), 4):
            some = flat[column : column + 4]
            regions.gather(*some, *[some[0]] * (4 - len(some)), samples, values, column, len(some))
        return values


def _thick(array: np.ndarray) -> np.ndarray:
    """A one-cell-wide array doubled across its width, so that it has cells between samples."""
    for axis in (1, 2):
        if array.shape[axis] == 1:
            array = np.repeat(array, 2, axis=axis)
    return np.ascontiguousarray(array)


@dataclass(frozen=True, eq=False)
class Topology:
    """Codes, edges and joined regions of one stack.

    A grid one cell wide is doubled across, so `shape` may be wider than the grid's.

    Attributes
    ----------
    code : (nz, ny, nx) int16
        Code of every sample.
    samples : (m,) int64
        Flat numbers of the samples near a boundary, and `values (m, fields)` their field values.
    row_of : (n,) int32
        Row in `samples` of every sample, or -1.
    count : (m, 7) uint8, start : (7 m + 1,) int64
        Number of intervals on each edge (0: of one code) and where they begin in
        `interval_code` and `interval_end`.
    """

    grid: Grid
    fields: FieldTable
    code: np.ndarray
    cells: np.ndarray
    samples: np.ndarray
    row_of: np.ndarray
    values: np.ndarray
    count: np.ndarray
    start: np.ndarray
    interval_code: np.ndarray
    interval_end: np.ndarray
    strides: np.ndarray = field(repr=False)
    corner_offsets: np.ndarray = field(repr=False)

    @classmethod
    def of(cls, grid: Grid, films: Sequence[Film]) -> Topology:
        doubled = {}

        def thick(array: np.ndarray | None) -> np.ndarray | None:
            if array is None or min(grid.shape[1:]) > 1:
                return array
            if id(array) not in doubled:
                doubled[id(array)] = _thick(array)
            return doubled[id(array)]

        wide = [Film(f.name, f.material, f.state, f.step, thick(f.top), thick(f.floor), thick(f.gone)) for f in films]  # type: ignore[arg-type]
        table = FieldTable.of(wide)
        shape = wide[0].top.shape
        _, ny, nx = shape
        code = film_codes(wide, shape)
        mixed = regions.mixed_cells(code)
        samples = np.flatnonzero(regions.near_samples(mixed))
        row_of = np.full(code.size, -1, np.int32)
        row_of[samples] = np.arange(len(samples), dtype=np.int32)
        cells = np.flatnonzero(mixed)
        values = table.gather(samples)
        strides = regions.EDGE_STEPS @ np.array([ny * nx, nx, 1])
        bits = np.arange(8)
        corner_offsets = (bits & 1) + ((bits >> 1) & 1) * nx + ((bits >> 2) & 1) * ny * nx
        flat = code.reshape(-1)
        count = regions.cut_edges(samples, row_of, flat, values, table.top, table.floor, table.gone, strides, shape)
        start = regions.edge_starts(count)
        interval_code, interval_end = regions.fill_edges(
            samples, row_of, flat, values, table.top, table.floor, table.gone, strides, count, start
        )
        return cls(
            grid, table, code, cells, samples, row_of, values, count, start,
            interval_code, interval_end, strides, corner_offsets,
        )  # fmt: skip

    @cached_property
    def piece(self) -> np.ndarray:
        """Root of every sample, then of every interval inside an edge: one film, or joined voids."""
        parent = joins.join_samples(self.code, len(self.interval_code))
        flat = self.code.reshape(-1)
        joins.join_edges(
            parent, self.samples, flat, self.strides, self.code.shape, self.count, self.start, self.interval_code
        )
        joins.join_thin(
            parent, self.cells, self.row_of, flat, self.count, self.start, self.interval_code, self.corner_offsets
        )
        return joins.flatten(parent)

    @cached_property
    def body(self) -> np.ndarray:
        """Like `piece`, with solids that touch joined too."""
        parent = self.piece.copy()
        joins.join_contacts(
            parent, self.samples, self.code.reshape(-1), self.strides, self.count, self.start, self.interval_code
        )
        return joins.flatten(parent)

    @cached_property
    def open_roots(self) -> np.ndarray:
        """Roots of the voids that the open front reaches."""
        top = self.code[-1]
        roots = self.piece[: self.code.size].reshape(self.code.shape)[-1]
        return np.unique(roots[top < 0])

    @cached_property
    def is_open(self) -> np.ndarray:
        """Whether a root is that of an open void, uint8 by root."""
        out = np.zeros(len(self.piece), np.uint8)
        out[self.open_roots] = 1
        return out

    @cached_property
    def open_space(self) -> np.ndarray:
        """Samples in the open space, `code.shape` bool."""
        void = self.code < 0
        roots = self.piece[: self.code.size].reshape(self.code.shape)
        if len(self.open_roots) == 1:
            return void & (roots == self.open_roots[0])
        return void & np.isin(roots, self.open_roots)

    @property
    def present(self) -> np.ndarray:
        """Which films have a sample or an interval, `(films,)` bool."""
        films = len(self.fields.top)
        return regions.films_in(self.code.reshape(-1), films) | regions.films_in(self.interval_code, films)

    @contextmanager
    def numbered(self, cells: np.ndarray, numbers: np.ndarray | int | None = None) -> Iterator[np.ndarray]:
        """Numbers of some cells by their flat place, int32, -1 elsewhere; good within the `with` alone."""
        self._numbers[cells] = np.arange(len(cells)) if numbers is None else numbers
        try:
            yield self._numbers
        finally:
            self._numbers[cells] = -1

    @cached_property
    def _numbers(self) -> np.ndarray:
        return np.full(self.code.size, -1, np.int32)

    @cached_property
    def is_mixed(self) -> np.ndarray:
        """Whether a mixed cell begins at a sample, flat bool."""
        out = np.zeros(self.code.size, bool)
        out[self.cells] = True
        return out

    @cached_property
    def contents(self) -> np.ndarray:
        """The films and open voids that reach into each mixed cell, as bits; see `kernels.contents`."""
        return contents.contents(
            self.cells, self.corner_offsets, self.row_of, self.code.reshape(-1), self.count, self.start,
            self.interval_code, self.is_open, self.piece,
        )  # fmt: skip

    @cached_property
    def inner(self) -> InnerIntervals:
        """The intervals that lie inside an edge and hold no sample."""
        return InnerIntervals.of(self)

    def on_grid(self, array: np.ndarray) -> np.ndarray:
        """An array over the (perhaps doubled) samples cut back to the grid's shape."""
        _, ny, nx = self.grid.shape
        return array.reshape(self.code.shape)[:, :ny, :nx]


@dataclass(frozen=True, eq=False)
class InnerIntervals:
    """Pieces of film or void thinner than the samples' spacing along some edge.

    `below` and `above` are the codes on either side along the edge.
    """

    node: np.ndarray
    row: np.ndarray
    direction: np.ndarray
    code: np.ndarray
    low: np.ndarray
    high: np.ndarray
    below: np.ndarray
    above: np.ndarray

    @classmethod
    def of(cls, topology: Topology) -> InnerIntervals:
        edges = np.flatnonzero(topology.count.reshape(-1) > 2)
        many = topology.count.reshape(-1)[edges].astype(np.int64) - 2
        edge = np.repeat(edges, many)
        first = np.repeat(np.cumsum(many) - many, many)
        at = topology.start[edge] + 1 + (np.arange(len(edge)) - first)
        return cls(
            node=topology.code.size + at,
            row=edge // 7,
            direction=edge % 7,
            code=topology.interval_code[at],
            low=topology.interval_end[at - 1],
            high=topology.interval_end[at],
            below=topology.interval_code[at - 1],
            above=topology.interval_code[at + 1],
        )
