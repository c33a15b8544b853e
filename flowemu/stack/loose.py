"""Loose bodies: how far they can move, and whether they can leave."""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass

import numpy as np

from flowemu.kernels import escape as kernel
from flowemu.stack.bodies import Part, surface_points
from flowemu.stack.stack import FilmStack

ALLOWED = 0.1  # of a cell: how deep a surface point may lie in the rest before it counts as touching
FINE = 0.02  # of a cell: play is found to this
MOST_PLACES = 4000  # offsets tried before the search is given up and the part called captive
MOST_POINTS = 6000
TURNS = 72
AXES = np.array([(-1, 0, 0), (1, 0, 0), (0, -1, 0), (0, 1, 0), (0, 0, -1), (0, 0, 1)], float)


@dataclass(frozen=True)
class Verdict:
    """What the search found.

    Attributes
    ----------
    state : str
        `captive` or `adrift`; `cut by the window` where its end lies outside.
    play : 6 floats or None
        Free travel along -x, +x, -y, +y, -z, +z in um; None where it has no end in the window. None if not looked for.
    searched : str
        What was tried, in words.
    """

    state: str
    play: tuple[float | None, ...] | None
    searched: str


class Obstacle:
    """The rest of the structure, asked whether the body at an offset runs into it."""

    def __init__(self, stack: FilmStack, part: Part, points: np.ndarray) -> None:
        self.stack, self.part = stack, part
        self.all_points = np.ascontiguousarray(points)
        step = max(1, len(points) // MOST_POINTS)
        self.points = np.ascontiguousarray(points[::step])
        self.centre = points.mean(axis=0) if len(points) else np.zeros(3)
        self.low = points.min(axis=0) if len(points) else np.zeros(3)
        self.high = points.max(axis=0) if len(points) else np.zeros(3)
        self.pieces = np.array(sorted(part.pieces), np.int64)
        self.shared = self._shared_films()
        t = stack.topology
        self.boxes = kernel.film_boxes(
            t.samples, t.code, t.count, t.start, t.interval_code, t.strides, len(stack.films)
        )
        self.order = list(self.shared)  # the film and the point that ran into the rest last are tried first
        self.hit = 0

    def _shared_films(self) -> dict[int, bool]:
        """Films of the rest, and whether the body holds pieces of the same film."""
        t = self.stack.topology
        roots = t.piece[: t.code.size].reshape(t.code.shape)
        mine = np.isin(roots, self.pieces)
        out = {}
        for k in range(len(self.stack.films)):
            if k not in self.part.films:
                out[k] = False
            elif bool(((t.code == k) & ~mine).any()):
                out[k] = True
        return out

    def touches(self, points: np.ndarray, offset: np.ndarray, turn: float) -> bool:
        """Whether one of these points, turned and moved, lies deeper in the rest than is allowed."""
        grid, t = self.stack.grid, self.stack.topology
        cosine, sine = (float(np.cos(turn)), float(np.sin(turn))) if turn else (1.0, 0.0)
        for k in self.order:
            film = self.stack.films[k]
            floor = film.top if film.floor is None else film.floor
            gone = film.top if film.gone is None else film.gone
            found = kernel.point_inside(
                points, offset, cosine, sine, self.centre, min(self.hit, len(points) - 1), ALLOWED * grid.cell,
                film.top, floor, gone, film.floor is not None, film.gone is not None, k, self.boxes[k],
                self.shared[k], t.code, t.piece, self.pieces, grid.x[0], grid.y[0], grid.cell, grid.z,
            )  # fmt: skip
            if found >= 0:
                self.hit = found
                self.order = [k, *(other for other in self.order if other != k)]
                return True
        return False

    def blocked(self, offset: np.ndarray, turn: float = 0.0, every: bool = False) -> bool:
        """Whether the body, turned about its axis along z and moved, runs into the rest.

        A share of its points is tried, and then, if `every` one is to count, all of them.
        """
        chosen = (self.points, self.all_points) if every else (self.points,)
        return any(self.touches(points, np.asarray(offset, np.float64), turn) for points in chosen)


def judge(stack: FilmStack, part: Part, points: np.ndarray | None = None) -> Verdict:
    """Whether a loose body can leave, moved through free space, and its play along each axis.

    `points` are its `surface_points`, if they are known.
    """
    obstacle = Obstacle(stack, part, surface_points(stack, part) if points is None else points)
    play = tuple(_play(obstacle, axis) for axis in AXES)
    way = _leaves(obstacle, play)
    if way is not None:
        return Verdict("adrift", play, way)
    tried = (
        f"translations at a pitch of {_pitch(obstacle, play):.2g} um and {TURNS} turns about z found no way out"
    )
    return Verdict("captive", play, tried)


def _play(obstacle: Obstacle, axis: np.ndarray) -> float | None:
    cell = obstacle.stack.grid.cell
    pitch = 0.5 * cell
    reach = float(np.abs(axis) @ (obstacle.high - obstacle.low)) + _height(obstacle)
    travel = 0.0
    while not obstacle.blocked(axis * (travel + pitch), every=True):
        travel += pitch
        if travel > reach:
            return None
    low, high = travel, travel + pitch
    while high - low > FINE * cell:
        middle = 0.5 * (low + high)
        if obstacle.blocked(axis * middle, every=True):
            high = middle
        else:
            low = middle
    return max(0.0, 0.5 * (low + high) - ALLOWED * cell)


def _height(obstacle: Obstacle) -> float:
    grid = obstacle.stack.grid
    return float(grid.planes[-1] - grid.planes[0])


def _pitch(obstacle: Obstacle, play: tuple[float | None, ...]) -> float:
    """At most a cell and a third of the smallest gap that can be passed."""
    gaps = [p + q for p, q in zip(play[::2], play[1::2], strict=True) if p is not None and q is not None and p + q > 0]
    return max(min([obstacle.stack.grid.cell, *(g / 3 for g in gaps)]), 0.05 * obstacle.stack.grid.cell)


def _leaves(obstacle: Obstacle, play: tuple[float | None, ...]) -> str | None:
    """How the body gets out, in words; None if no way was found."""
    names = ("to the left", "to the right", "to the front", "to the back", "downward", "straight up")
    for k in (5, 0, 1, 2, 3):
        if play[k] is None:
            return f"it can leave {names[k]}"
    if _floods_out(obstacle, play):
        return "it can leave sideways and up"
    if _turns_out(obstacle, play):
        return "it can leave when turned about z"
    return None


def _floods_out(obstacle: Obstacle, play: tuple[float | None, ...]) -> bool:
    """Flood through free offsets on a lattice, upward first, until the body is clear of the rest."""
    pitch = _pitch(obstacle, play)
    top = _free_height(obstacle)
    start = (0, 0, 0)
    seen = {start}
    front = deque([start])
    while front and len(seen) < MOST_PLACES:
        place = front.popleft()
        for axis in (5, 0, 1, 2, 3, 4):
            step = AXES[axis].astype(int)
            near = (place[0] + int(step[0]), place[1] + int(step[1]), place[2] + int(step[2]))
            if near in seen:
                continue
            seen.add(near)
            offset = np.array(near) * pitch
            if obstacle.blocked(offset):
                continue
            if offset[2] >= top:
                return True
            (front.appendleft if axis == 5 else front.append)(near)
    return False


def _free_height(obstacle: Obstacle) -> float:
    """How far the body must rise to be above everything else."""
    stack = obstacle.stack
    solid = (stack.topology.code >= 0).any(axis=(1, 2))
    highest = float(stack.grid.z[np.flatnonzero(solid)[-1]]) if solid.any() else 0.0
    return max(highest - float(obstacle.low[2]), stack.grid.cell)


def _turns_out(obstacle: Obstacle, play: tuple[float | None, ...]) -> bool:
    """Turn the body step by step and try to lift it at each turn it can reach."""
    pitch, top = _pitch(obstacle, play), _free_height(obstacle)
    for direction in (1, -1):
        for k in range(1, TURNS):
            turn = direction * 2 * np.pi * k / TURNS
            if obstacle.blocked(np.zeros(3), turn):
                break
            if play[5] is not None and obstacle.blocked(np.array([0.0, 0.0, min(play[5] + pitch, top)]), turn):
                continue
            rise = pitch
            while rise < top and not obstacle.blocked(np.array([0.0, 0.0, rise]), turn):
                rise += pitch
            if rise >= top:
                return True
        else:
            return False  # all the way round: the other way leads to the same turns
    return False
