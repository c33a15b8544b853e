"""The film stack: the whole geometry, and the three operations that every step is made of."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from flowemu.stack.film import BAND, Film
from flowemu.stack.grid import Grid
from flowemu.stack.invariants import watch

if TYPE_CHECKING:
    from flowemu.stack.topology import Topology


SKIN = 0.25  # of a cell: what a shallow etch takes off a film's top is a change of that top, not a cut


def skims(film: Film, removed: np.ndarray, cell: float) -> bool:
    """Whether a removed field takes no more than a skin off the film's top, and not half of its thickness."""
    from flowemu.kernels import skin

    floor = film.top if film.floor is None else film.floor
    return bool(skin.skims(film.top, floor, film.floor is not None, removed, 1.5 * cell, SKIN * cell, 0.5))


@dataclass(frozen=True, eq=False)
class FilmStack:
    """Ordered films on a grid, the wafer first; nothing of a stack is ever written into.

    Attributes
    ----------
    laid : (nz, ny, nx) float32, um
        The surface when it was last made, and `cut` whether something has been taken away since.
    """

    grid: Grid
    films: tuple[Film, ...]
    laid: np.ndarray
    cut: bool = False

    @classmethod
    def bare(cls, grid: Grid, material: str, state: str | None = None) -> FilmStack:
        """A bare wafer, its front face at z = 0."""
        height = np.broadcast_to(grid.z.astype(np.float32)[:, None, None], grid.shape)
        top = np.ascontiguousarray(height)
        return cls(grid, (Film("wafer", material, state, 0, top),), top)

    @cached_property
    def topology(self) -> Topology:
        """Codes, pieces, bodies and open space of this stack (made when first asked for)."""
        from flowemu.stack.topology import Topology

        return Topology.of(self.grid, self.films)

    @cached_property
    def surface(self) -> np.ndarray:
        """Signed distance to the solid's surface, `(nz, ny, nx)` float32 um, negative inside; the next film lies on it.

        Solid or void thinner than a cell shows in the films and not here. It is made when first asked for, as most
        stacks that something was taken from never carry a film.
        """
        from flowemu.stack.surfaces import recut_surface

        return recut_surface(self.grid, self.films, self.topology, self.laid) if self.cut else self.laid

    @property
    def band(self) -> float:
        """Width in um of the band in which the fields are distances."""
        return BAND * self.grid.cell

    def index(self, name: str) -> int | None:
        """Number of the last film of this name."""
        for k in range(len(self.films) - 1, -1, -1):
            if self.films[k].name == name:
                return k
        return None

    def add(self, film: Film) -> FilmStack:
        """Append a film, given with the `top` field of the solid it makes with what is below it."""
        laid = replace(film, floor=self.surface)
        return watch(self, FilmStack(self.grid, (*self.films, laid), film.top), "add")

    def carve(self, removed: Mapping[int, np.ndarray | None]) -> FilmStack:
        """Take away from each named film what lies where its removed field is positive, or all of it if that is None.

        A field raises the film's `gone` field, or its `top` where it only skims that; films left with
        nothing are dropped. Where nothing is taken the very same stack comes back.
        """
        films = [self._carved(film, removed[k]) if k in removed else film for k, film in enumerate(self.films)]
        if all(new is old for new, old in zip(films, self.films, strict=True)):
            return self
        return watch(self, self._recut([film for film in films if film is not None]), "carve", set(removed))

    def _carved(self, film: Film, field: np.ndarray | None) -> Film | None:
        """What is left of a film; the very film if nothing of it is taken, None if all of it is."""
        from flowemu.stack.measure import film_volume

        if field is None or not bool(np.any(field > 0)):
            return None if field is None else film
        if skims(film, field, self.grid.cell):
            new = replace(film, top=np.maximum(film.top, field))
        else:
            new = replace(film, gone=field if film.gone is None else np.maximum(film.gone, field))
        return new if film_volume(new, self.grid) < film_volume(film, self.grid) else film

    def without(self, numbers: set[int]) -> FilmStack:
        """The stack with whole films taken away."""
        return self._recut([film for k, film in enumerate(self.films) if k not in numbers]) if numbers else self

    def split(self, k: int, region: np.ndarray, film: Film) -> FilmStack:
        """Turn the part of film `k` where `region` is negative into another film (its fields are set here)."""
        old = self.films[k]
        outside = -region
        part = replace(
            film,
            top=old.top,
            floor=old.floor,
            gone=region if old.gone is None else np.maximum(old.gone, region),
        )
        rest = replace(old, gone=outside if old.gone is None else np.maximum(old.gone, outside))
        return self._with((*self.films[:k], rest, part, *self.films[k + 1 :]))

    def turned(self, k: int, **changes: object) -> FilmStack:
        """Film `k` with another material or state, the geometry untouched."""
        films = list(self.films)
        films[k] = replace(films[k], **changes)  # type: ignore[arg-type]
        return self._with(tuple(films))

    @property
    def _last_surface(self) -> np.ndarray:
        return self.surface if "surface" in self.__dict__ else self.laid

    def _with(self, films: tuple[Film, ...]) -> FilmStack:
        """Other films of the same shape."""
        return FilmStack(self.grid, films, self._last_surface, self.cut and "surface" not in self.__dict__)

    def _recut(self, films: list[Film]) -> FilmStack:
        from flowemu.stack.measure import film_volume
        from flowemu.stack.topology import Topology

        films = [film for k, film in enumerate(films) if k == 0 or film_volume(film, self.grid) > 0]
        topology = Topology.of(self.grid, films)
        present = topology.present
        present[0] = True
        if not present.all():
            films = [film for film, there in zip(films, present, strict=True) if there]
            topology = Topology.of(self.grid, films)
        stack = FilmStack(self.grid, tuple(films), self._last_surface, cut=True)
        stack.__dict__["topology"] = topology
        return stack
