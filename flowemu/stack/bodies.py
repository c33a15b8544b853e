"""Parts and bodies: named pieces of film, and what is joined to the wafer."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from flowemu.stack.stack import FilmStack
from flowemu.stack.topology import Topology

Place = tuple[str | None, tuple[float, float]]  # a film's name (None: the topmost one) and (x, y) in um


@dataclass(frozen=True, eq=False)
class Part:
    """A named piece of film, or a body without the wafer.

    Attributes
    ----------
    films : frozenset of int
        Film numbers.
    pieces : frozenset of int
        Roots in `Topology.piece`; `body` is the root in `Topology.body`.
    held : bool
        Whether its body is the wafer's.
    at_side : bool
        Whether it reaches a side of the window.
    """

    name: str
    films: frozenset[int]
    pieces: frozenset[int]
    body: int
    held: bool
    at_side: bool
    named: bool


def wafer_body(t: Topology) -> int:
    """Root of the body that the wafer belongs to."""
    bottom = t.code[0].reshape(-1)
    mine = np.flatnonzero(bottom == 0)
    return int(t.body[mine[0]]) if len(mine) else -1


def _pieces_of(t: Topology) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Film, root and body root of every piece of film."""
    n = t.code.size
    thin = t.inner.node
    roots = np.concatenate(
        [np.flatnonzero(t.piece[:n] == np.arange(n, dtype=t.piece.dtype)), thin[t.piece[thin] == thin]]
    )
    inner = roots >= n
    film = np.concatenate([t.code.reshape(-1)[roots[~inner]], t.interval_code[roots[inner] - n]])
    solid = film >= 0
    return film[solid], roots[solid], t.body[roots[solid]]


def piece_at(stack: FilmStack, film: str | None, x: float, y: float) -> tuple[int, int, int] | None:
    """Film number, piece root and body root of the topmost piece of a film at (x, y); None if there is none."""
    t, grid = stack.topology, stack.grid
    _, ny, nx = t.code.shape
    ix = min(max(int((x - grid.x0) / grid.cell), 0), grid.nx - 1)
    iy = min(max(int((y - grid.y0) / grid.cell), 0), grid.ny - 1)
    wanted = [k for k, f in enumerate(stack.films) if (film is None and k > 0 and f.name != "resist") or f.name == film]
    column = t.code[:, iy, ix]
    inside = np.flatnonzero(np.isin(column, wanted))
    if len(inside):
        z = int(inside[-1])
        node = (z * ny + iy) * nx + ix
        return int(column[z]), int(t.piece[node]), int(t.body[node])
    inner = t.inner
    sample = t.samples[inner.row]
    here = (inner.direction == 2) & (sample % (ny * nx) == iy * nx + ix) & np.isin(inner.code, wanted)
    if here.any():
        k = np.flatnonzero(here)[-1]
        node = int(inner.node[k])
        return int(inner.code[k]), int(t.piece[node]), int(t.body[node])
    return None


def find_parts(stack: FilmStack, places: Mapping[str, Place]) -> list[Part]:
    """Named parts that are there, then every loose body that has no name.

    Bodies are numbered by where they lie, so the names do not depend on the order of the films.
    """
    t = stack.topology
    wafer = wafer_body(t)
    film, piece, body = _pieces_of(t)
    sides = _side_pieces(t)
    parts = []
    named_bodies = set()
    for name, (film_name, (x, y)) in places.items():
        found = piece_at(stack, film_name, x, y)
        if found is None:
            continue
        k, root, of_body = found
        held = of_body == wafer
        pieces = frozenset([root]) if held else frozenset(np.unique(piece[body == of_body]).tolist())
        films = frozenset([k]) if held else frozenset(int(f) for f in np.unique(film[body == of_body]))
        named_bodies.add(of_body)
        parts.append(Part(name, films, pieces, of_body, held, bool(pieces & sides), True))
    for root in np.unique(body):
        if int(root) in named_bodies or int(root) == wafer:
            continue
        mine = body == root
        films = frozenset(int(f) for f in np.unique(film[mine]))
        pieces = frozenset(int(p) for p in np.unique(piece[mine]))
        name = f"{stack.films[max(films)].name} piece {len(parts) + 1}"
        parts.append(Part(name, films, pieces, int(root), False, bool(pieces & sides), False))
    return parts


def _side_pieces(t: Topology) -> frozenset[int]:
    """Roots of the pieces that reach a side of the window."""
    roots = t.piece[: t.code.size].reshape(t.code.shape)
    grid = t.grid
    faces: list[np.ndarray] = []
    if grid.nx > 1:
        faces += [roots[:, :, 0][t.code[:, :, 0] >= 0], roots[:, :, -1][t.code[:, :, -1] >= 0]]
    if grid.ny > 1:
        faces += [roots[:, 0, :][t.code[:, 0, :] >= 0], roots[:, -1, :][t.code[:, -1, :] >= 0]]
    return frozenset(int(r) for face in faces for r in np.unique(face))


def part_samples(stack: FilmStack, part: Part) -> np.ndarray:
    """Samples in the part, over the grid, `(nz, ny, nx)` bool."""
    t = stack.topology
    roots = t.piece[: t.code.size].reshape(t.code.shape)
    mine = np.zeros(len(t.piece), bool)
    mine[list(part.pieces)] = True
    return t.on_grid(mine[roots])


def part_columns(stack: FilmStack, part: Part) -> np.ndarray:
    """Columns in which the part lies, `(ny, nx)` bool."""
    t = stack.topology
    columns = part_samples(stack, part).any(axis=0)
    inner = t.inner
    mine = np.isin(t.piece[inner.node], np.array(sorted(part.pieces))) & (inner.direction == 2)
    _, ny, nx = t.code.shape
    at = t.samples[inner.row[mine]] % (ny * nx)
    wide = np.zeros((ny, nx), bool)
    wide.reshape(-1)[at] = True
    return columns | wide[: columns.shape[0], : columns.shape[1]]


def box_and_volume(
    stack: FilmStack, part: Part, points: np.ndarray | None = None
) -> tuple[tuple[float, float, float, float, float, float], float]:
    """Box `(x0, y0, z0, x1, y1, z1)` in um and volume in um3 of a part, from its `surface_points` if given."""
    from flowemu.stack.measure import film_volume

    points = surface_points(stack, part) if points is None else points
    if not len(points):
        return (0.0, 0.0, 0.0, 0.0, 0.0, 0.0), 0.0
    (x0, y0, z0), (x1, y1, z1) = points.min(axis=0).tolist(), points.max(axis=0).tolist()
    volume = sum(film_volume(stack.films[k], stack.grid) * _share_of_film(stack, part, k) for k in part.films)
    return (x0, y0, z0, x1, y1, z1), volume


def _share_of_film(stack: FilmStack, part: Part, k: int) -> float:
    """Share of film `k` that belongs to the part, by the lengths of its columns' intervals."""
    from flowemu.kernels import beam

    t = stack.topology
    mine, whole = beam.piece_length(
        t.code, t.row_of, t.count, t.start, t.interval_code, t.interval_end, stack.grid.z, k, t.piece,
        np.array(sorted(part.pieces), np.int64),
    )  # fmt: skip
    return mine / whole if whole > 0 else 0.0


def surface_points(stack: FilmStack, part: Part) -> np.ndarray:
    """Points where grid edges leave the part, `(m, 3)` float64 (x, y, z) um, exact to the fields.

    With them the side ends of what is too thin to hold a sample.
    """
    from flowemu.kernels import escape
    from flowemu.stack.sides import side_points

    t, grid = stack.topology, stack.grid
    pieces = np.array(sorted(part.pieces), np.int64)
    points = escape.leaving_points(
        t.samples, t.code.reshape(-1), t.strides, t.code.shape, t.count, t.start, t.interval_code, t.interval_end,
        t.piece, pieces, grid.z, grid.cell, grid.cell,
    )  # fmt: skip
    points[:, 0] += grid.x[0]
    points[:, 1] = points[:, 1] + grid.y[0] if grid.ny > 1 else grid.y[0]
    return np.concatenate([points, side_points(stack, pieces)])


def contact_area(stack: FilmStack, parts: Iterable[int], others: Iterable[int] | None = None) -> float:
    """Area in which the given pieces touch other solids, um2, seen along z and along the sides."""
    from flowemu.kernels import beam

    t, grid = stack.topology, stack.grid
    area = beam.touching_area(
        t.samples, t.code.reshape(-1), t.strides, t.code.shape, t.count, t.start, t.interval_code, t.piece,
        np.array(sorted(parts), np.int64), grid.z, grid.cell, min(grid.nx, grid.ny) == 1,
    )  # fmt: skip
    return float(area)
