"""Fronts that pass from film to film, and the quick way where a bare face is plain."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import plain
from flowemu.steps.models.coating import coat
from tests import stacks


def under_a_mask(films: list[float], mask: float = 4.3):
    """Glasses of these thicknesses under a mask that ends at x = 4.3."""
    grid = stacks.even_grid(30, -2, 18)
    stack = stacks.bare(grid, 0.37)
    for k, thickness in enumerate(films):
        stack = coat(stack, stacks.blank(f"glass {k}"), thickness)
    stack = coat(stack, stacks.blank("mask"), 1.2)
    stack = stacks.printed(stack, mask - grid.x, thickness=2.0)
    return stacks.stripped(stacks.beam_etch(stack, {"mask": 1.0}, 1.6))


def latest(stack, films: int) -> np.ndarray:
    """Arrival at every sample in a glass, s; nan elsewhere."""
    out = np.full(stack.topology.code.size, np.nan)
    arrival = stacks.front(stack, {f"glass {k}": 1.0 for k in range(films)})
    for k in range(films):
        number = stack.index(f"glass {k}")
        sample, time = arrival.of_film(number)
        own = stack.topology.code.reshape(-1)[sample] == number
        out[sample[own]] = time[own]
    return out


@pytest.mark.parametrize("films", [[3.1, 3.5], [3.1, 0.4, 3.1], [6.2, 0.4]])
def test_films_of_one_rate_are_etched_as_one(films):
    """The times in a glass laid in several goes are those in one of the same thickness: to 0.2 cell, 0.1 on average.

    Seen: 0.03 at most but where a thin film lies on top, 0.19.
    """
    parts, whole = latest(under_a_mask(films), len(films)), latest(under_a_mask([sum(films)]), 1)
    both = np.isfinite(parts) & np.isfinite(whole)
    assert both.sum() > 250
    off = np.abs(parts - whole)[both]
    assert off.mean() < 0.1
    assert off.max() < 0.2


def test_a_stop_between_films_of_one_rate_stops_the_front():
    """A stop of a fifth of a cell between two glasses: the lower one is never reached, whatever the height."""
    for height in (0.0, 0.3, 0.6, 0.9):
        grid = stacks.even_grid(12, -2, 10)
        stack = coat(stacks.bare(grid, height), stacks.blank("lower"), 1.3)
        stack = coat(stack, stacks.blank("stop"), 0.2)
        stack = coat(stack, stacks.blank("upper"), 1.3)
        arrival = stacks.front(stack, {"lower": 1.0, "upper": 1.0})
        assert np.isfinite(arrival.of_film(stack.index("upper"))[1]).all()
        assert not np.isfinite(arrival.of_film(stack.index("lower"))[1]).any()


def test_the_quick_way_over_plain_faces_gives_the_times_of_the_long_one(monkeypatch):
    """With no cell taken for plain the times are the same to 0.01 cell, on a pit's floor, walls and corners."""
    grid = stacks.even_grid(60, -12, 14)
    stack = coat(stacks.bare(grid, 0.13), stacks.blank("glass 0"), 7.3)
    stack = stacks.printed(stack, np.abs(grid.x - 30) - 20)
    stack = stacks.stripped(stacks.beam_etch(stack, {"glass 0": 1.0}, 3.0))
    used = []
    way = plain.mark_around

    def watched(cells, shape, wide, out):
        way(cells, shape, wide, out)
        used.append(int((~out).sum()))

    monkeypatch.setattr(plain, "mark_around", watched)
    quick = latest(stack, 1)
    assert used[0] > 0
    monkeypatch.setattr(plain, "plain_fields", lambda cells, *_: np.full(len(cells), -1))
    slow = latest(stack, 1)
    there = np.isfinite(slow)
    assert np.array_equal(there, np.isfinite(quick))
    assert np.abs(quick - slow)[there].max() < 0.01
