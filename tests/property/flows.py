"""Random flows of a few steps on random masks, on small grids, for the tests of properties.

The rates are those of a careless trade: masks erode, films below are
eaten, so that films of all thicknesses, walls and gaps come about.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from hypothesis import Phase
from hypothesis import strategies as st

from flowemu.stack.stack import FilmStack
from flowemu.steps.models.coating import coat, spin
from flowemu.steps.models.masking import print_resist
from tests import stacks

PHASES = (Phase.explicit, Phase.generate)  # a failing flow is told as it is: shrinking one takes minutes
LENGTH = st.integers(4, 48).map(lambda n: n / 16)  # 0.25 to 3 cells, faces on samples and off them
RATE = st.sampled_from([0.0, 0.004, 0.1, 0.5, 1.0])
BOXES = st.lists(
    st.tuples(st.integers(0, 11), st.integers(0, 11), st.integers(2, 6), st.integers(2, 6)), min_size=1, max_size=3
)


@dataclass(frozen=True)
class Layout:
    """Boxes `(x, y, width, height)` um of a mask, moved by a share of a cell."""

    boxes: tuple[tuple[int, int, int, int], ...]
    offset: float

    def opened(self, stack: FilmStack) -> np.ndarray:
        """Planar distance, positive inside the boxes, `(ny, nx)` um."""
        grid = stack.grid
        x, y = np.meshgrid(grid.x - self.offset, grid.y - self.offset)
        inside = []
        for left, low, width, height in self.boxes:
            across = np.abs(x - left - width / 2) - width / 2
            along = np.abs(y - low - height / 2) - height / 2 if grid.ny > 1 else np.full_like(x, -np.inf)
            outside = np.hypot(np.maximum(across, 0.0), np.maximum(along, 0.0))
            inside.append(-outside - np.minimum(np.maximum(across, along), 0.0))
        return np.max(inside, axis=0)


@dataclass(frozen=True)
class Step:
    """One move, with its numbers, as hypothesis prints it."""

    kind: str
    amount: float = 0.0
    share: float = 1.0
    rates: tuple[float, ...] = ()
    layout: Layout | None = None

    def run(self, stack: FilmStack, number: int) -> FilmStack:
        """The stack after the move, which is the flow's `number`-th."""
        film = stacks.blank(f"film {number}", step=number)
        if self.kind == "coat":
            return coat(stack, film, self.amount, self.share)
        if self.kind == "spin":
            return spin(stack, film, self.amount)
        if self.kind == "print":
            assert self.layout is not None
            resist = replace(film, name="resist")
            return print_resist(stack, resist, self.amount, self.layout.opened(stack), 90.0)
        if self.kind == "strip":
            return stacks.stripped(stack)
        etch = stacks.beam_etch if self.kind == "beam" else stacks.wet_etch
        return etch(stack, self.rates_of(stack), self.amount)

    def rates_of(self, stack: FilmStack) -> dict[str, float]:
        """Rates by film name, given round to the films in turn; the wafer has the slowest."""
        names = list(dict.fromkeys(film.name for film in stack.films[1:]))
        out = {name: self.rates[k % len(self.rates)] for k, name in enumerate(names)}
        out["wafer"] = min(self.rates)
        return out

    @property
    def adds(self) -> bool:
        return self.kind in ("coat", "spin")


LAYOUT = st.builds(lambda boxes, k: Layout(tuple(boxes), k / 16), BOXES, st.integers(0, 15))
COAT = st.builds(lambda t, c: Step("coat", t, c), LENGTH, st.sampled_from([1.0, 1.0, 0.6]))
SPIN = st.builds(lambda t: Step("spin", t), LENGTH)
PRINT = st.builds(lambda t, m: Step("print", 2.0 + t, layout=m), LENGTH, LAYOUT)
RATES = st.lists(RATE, min_size=2, max_size=3).map(tuple)
BEAM = st.builds(lambda t, r: Step("beam", t, rates=r), LENGTH, RATES)
WET = st.builds(lambda t, r: Step("wet", t, rates=r), LENGTH, RATES)
STRIP = st.just(Step("strip"))
FLOW = st.lists(st.one_of(COAT, PRINT, BEAM, WET, STRIP, COAT, SPIN), min_size=3, max_size=6)


def beginning(height: float, ny: int = 1) -> FilmStack:
    """A bare wafer with its face at this height in a box of 14 x ny x 18 cells."""
    return stacks.bare(stacks.even_grid(14, -4, 14, ny=ny), height)


def volume(stack: FilmStack) -> float:
    """Volume of all films, um3."""
    from flowemu.stack.measure import film_volume

    return sum(film_volume(film, stack.grid) for film in stack.films)


def carried_out(steps: Sequence[Step], stack: FilmStack) -> FilmStack:
    """The stack after all the moves."""
    for number, step in enumerate(steps, 1):
        stack = step.run(stack, number)
    return stack
