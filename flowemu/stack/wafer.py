"""A wafer on its way through the flow: its structure, its back side, and what was done to it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from flowemu.stack.stack import FilmStack


@dataclass(frozen=True)
class Coat:
    """A film on the wafer's back, which the grid does not reach; thickness in um."""

    name: str
    material: str
    state: str | None
    thickness: float
    step: int


@dataclass(frozen=True, eq=False)
class Laid:
    """A film was put down on what `names[rests]` says, column by column, `(ny, nx)` int."""

    step: int
    film: str
    rests: np.ndarray
    names: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class Printed:
    """A mask was printed; `opened (ny, nx)` um is positive where the resist was opened."""

    step: int
    mask: str
    opened: np.ndarray
    narrow: tuple[tuple[float, float, float], ...] = ()


@dataclass(frozen=True)
class Loss:
    """What an etch took from a film.

    `depth` is how deep it went in where it began first, `thickness` the film's usual one, both um;
    `meant` says whether the step was there to etch this film, `through` whether it cut it anywhere.
    """

    film: str
    material: str
    rate: float
    depth: float
    thickness: float
    volume: float
    meant: bool
    through: bool
    at: tuple[float, float, float] | None = None


@dataclass(frozen=True)
class Freed:
    """When a part comes free of what a release etches; `film` and `at` are the last of it."""

    part: str
    time: float
    film: str | None
    at: tuple[float, float, float] | None


@dataclass(frozen=True)
class Cut:
    """An etch, strip, polish or release took something away."""

    step: int
    verb: str
    agent: str
    time: float
    mask: str | None
    losses: tuple[Loss, ...] = ()
    freed: tuple[Freed, ...] = ()


@dataclass(frozen=True, eq=False)
class Loosened:
    """A body that nothing holds was found loose after a release; see `stack.loose`.

    `columns (ny, nx)` are those it lies in, `outline (n, 2)` um the points in x and y at which the grid's edges leave
    it; `sliver` marks a nameless one too small to be a part.
    """

    step: int
    part: str
    films: tuple[str, ...]
    state: str
    volume: float
    box: tuple[float, float, float, float, float, float]
    play: tuple[float | None, ...] | None
    searched: str
    columns: np.ndarray
    outline: np.ndarray
    sliver: bool = False


@dataclass(frozen=True)
class Unresolved:
    """A place thinner than the grid can tell, and the cell that would do, um."""

    step: int
    film: str | None
    text: str
    at: tuple[float, float, float] | None
    size: float


Event = Laid | Printed | Cut | Loosened | Unresolved


@dataclass(frozen=True, eq=False)
class Wafer:
    """The state that every step takes and gives back; nothing of it is written into.

    Attributes
    ----------
    back : tuple of Coat
        One-dimensional ledger of the back side, from the wafer outward.
    printed : Printed or None
        The mask whose resist is on the wafer.
    """

    stack: FilmStack
    back: tuple[Coat, ...] = ()
    events: tuple[Event, ...] = ()
    printed: Printed | None = None

    def now(self, stack: FilmStack, *events: Event, **changes: object) -> Wafer:
        """The wafer with another structure and what led to it."""
        return replace(self, stack=stack, events=(*self.events, *events), **changes)  # type: ignore[arg-type]

    def thinned_back(self, rates: Mapping[str, float], time: float) -> tuple[Coat, ...]:
        """The back side's ledger after `time` s in a bath with these rates (um/s by film name)."""
        coats = list(self.back)
        while coats and time > 0:
            coat = coats[-1]
            rate = rates.get(coat.name, 0.0)
            if rate <= 0:
                break
            if rate * time < coat.thickness:
                coats[-1] = replace(coat, thickness=coat.thickness - rate * time)
                break
            time -= coat.thickness / rate
            coats.pop()
        return tuple(coats)
