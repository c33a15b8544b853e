"""Films and gaps of 0.1 to 3 cells: right in thickness, connectivity and etching, or said to be unresolved.

The test that settled the geometry. One field for the union of the films, as drawn on nested fields, loses a free plate
under a cell (the twin here); with a top, a floor and a gone field for every film nothing is lost, whatever the offset.
"""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.bodies import find_parts
from flowemu.steps.models.coating import coat
from tests import stacks

THIN = (0.1, 0.3, 0.6, 1.0, 1.5, 2.0, 3.0)
ANCHOR = 10.3
HOLE = 45.2


def bridge(gap: float, plate: float, offset: float):
    """A plate over a sacrificial film, anchored at x < 10.3 + offset and open from x = 45.2 - offset on."""
    grid = stacks.even_grid(56, -4, 12)
    stack = coat(stacks.bare(grid, 0.0), stacks.blank("base"), 0.37 + offset)
    stack = coat(stack, stacks.blank("sac"), gap)
    stack = stacks.printed(stack, ANCHOR + offset - grid.x)
    stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0, "base": 0.01}, 1.2 * gap))
    stack = coat(stack, stacks.blank("plate"), plate)
    stack = stacks.printed(stack, grid.x - HOLE + offset)
    return stacks.stripped(stacks.beam_etch(stack, {"plate": 1.0}, 1.5 * plate + gap))


def offsets() -> np.ndarray:
    return np.random.default_rng(0).uniform(0, 1, 4)


def heights_of(stack, name: str, x: float) -> tuple[float, float]:
    """Lowest and highest place of a film in a column, um."""
    found = [(low, high) for film, low, high in stacks.layers(stack, x) if film == name]
    assert found, f"{name} is lost at x = {x}"
    return found[0][0], found[-1][1]


@pytest.mark.parametrize("plate", [0.1, 0.5, 1.0, 3.0])
@pytest.mark.parametrize("gap", THIN)
def test_a_free_plate_over_a_free_gap(gap, plate):
    """Once released: plate and gap to 2 % or 0.02 cell, the plate held at its anchor, nothing of the film left."""
    for offset in offsets():
        stack = bridge(gap, plate, offset)
        released = stack.carve(stacks.front(stack, {"sac": 1.0}).removed(40.0))
        for x in (20.0, 33.3, 42.0):
            low, high = heights_of(released, "plate", x)
            base = heights_of(released, "base", x)[1]
            assert high - low == pytest.approx(plate, abs=max(0.02 * plate, 0.02))
            assert low - base == pytest.approx(gap, abs=max(0.02 * gap, 0.02))
        assert all(name != "sac" for name, _, _ in stacks.layers(released, 20.0))
        (part,) = [p for p in find_parts(released, {"plate": ("plate", (30.0, 0.5))}) if p.named]
        assert part.held


@pytest.mark.parametrize("plate", [0.3, 3.0])
@pytest.mark.parametrize("gap", THIN)
def test_a_thin_film_is_etched_from_its_side(gap, plate):
    """After 15 s at 1 um/s the front has gone 15 cells under the plate, to 0.1 (seen: 0.08).

    At the film's foot it has to come from the plate's lower edge: sqrt(15^2 - gap^2), and no later anywhere.
    """
    for offset in offsets():
        stack = bridge(gap, plate, offset)
        after = stacks.wet_etch(stack, {"sac": 1.0}, 15.0)
        here = np.arange(26.0, 36.0, 0.02)
        left = [any(name == "sac" for name, _, _ in stacks.layers(after, x)) for x in here]
        edge = here[np.flatnonzero(left)[-1]]
        assert edge == pytest.approx(HOLE - offset - np.sqrt(225 - gap**2), abs=0.1)


@pytest.mark.parametrize("gap", THIN)
def test_the_front_gets_to_every_place_of_a_thin_film_in_its_time(gap):
    """At a distance d from the hole d < T < sqrt(d^2 + gap^2), to 0.15 cell: no place is left out, none comes early."""
    for offset in offsets():
        stack = bridge(gap, 1.0, offset)
        arrival = stacks.front(stack, {"sac": 1.0})
        sample, times = arrival.of_film(stack.index("sac"))
        assert np.isfinite(times).all()
        x = stack.grid.x[sample % stack.grid.nx]
        away = HOLE - offset - x
        under = away > 1
        assert (times - away)[under].min() > -0.15
        assert (times - np.hypot(away, gap))[under].max() < 0.15


@pytest.mark.parametrize("thickness", THIN)
def test_a_plate_cut_off_its_anchor_is_loose_however_thin(thickness):
    """The same bridge, cut through at x = 15 to 20: its two halves are two pieces, one held and one not."""
    for offset in offsets():
        stack = bridge(0.8, thickness, offset)
        stack = stacks.printed(stack, 2.5 - np.abs(stack.grid.x - 17.5))
        stack = stacks.stripped(stacks.beam_etch(stack, {"plate": 1.0}, thickness + 0.5))
        released = stack.carve(stacks.front(stack, {"sac": 1.0}).removed(40.0))
        places = {"anchored": ("plate", (12.5, 0.5)), "loose": ("plate", (30.0, 0.5))}
        held = {part.name: part.held for part in find_parts(released, places)}
        assert held == {"anchored": True, "loose": False}


def union_of(stack) -> np.ndarray:
    """The twin: one field for the solid, as kept by films nested in each other; negative inside."""
    solids = []
    for film in stack.films:
        bounds = [film.top]
        bounds += [-film.floor] if film.floor is not None else []
        bounds += [film.gone] if film.gone is not None else []
        solids.append(np.max(bounds, axis=0))
    return np.min(solids, axis=0)


def plate_in_union(stack, x: int) -> float:
    """Thickness of what the twin has above the wafer's base in a column of samples."""
    places = stacks.crossings(union_of(stack)[:, 0, x], stack.grid.z)[1:]
    return float(np.sum(places[1::2] - places[0::2])) if len(places) else 0.0


@pytest.mark.parametrize(("thickness", "lost"), [(0.1, 0.8), (0.5, 0.3)])
def test_one_field_for_the_union_loses_thin_free_plates(thickness, lost):
    """Why films keep three fields each: of free plates at even offsets the twin loses this share, the program none."""
    gone = 0
    for offset in np.arange(10) / 10 + 0.03:
        stack = bridge(1.5, thickness, offset)
        released = stack.carve(stacks.front(stack, {"sac": 1.0}).removed(40.0))
        gone += plate_in_union(released, 30) == 0.0
        assert stacks.thickness(released, "plate", 30.5) == pytest.approx(thickness, abs=0.02)
    assert gone >= 10 * lost


def test_one_field_for_the_union_reads_a_plate_of_a_cell_thin():
    """At one cell the twin keeps the plate and reads it 5 % or more too thin on average; the program 2 % at most."""
    twin, ours = [], []
    for offset in np.arange(10) / 10 + 0.03:
        stack = bridge(1.5, 1.0, offset)
        released = stack.carve(stacks.front(stack, {"sac": 1.0}).removed(40.0))
        twin.append(plate_in_union(released, 30))
        ours.append(stacks.thickness(released, "plate", 30.5))
    assert np.mean(twin) < 0.95
    assert ours == pytest.approx([1.0] * 10, abs=0.02)
