"""The invariants' own functions: each must be able to say no."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from flowemu.stack import invariants
from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.coating import coat
from tests import stacks


@pytest.fixture
def pair() -> tuple[FilmStack, FilmStack]:
    """A stack of two films, and the same with the upper one etched by half."""
    grid = stacks.even_grid(8, -4, 8)
    stack = coat(coat(stacks.bare(grid, 0.2), stacks.blank("low"), 1.7), stacks.blank("high", step=2), 1.6)
    return stack, stacks.beam_etch(stack, {"high": 1.0}, 0.8)


def with_films(stack: FilmStack, **changed: Film) -> FilmStack:
    films = tuple(changed.get(film.name, film) for film in stack.films)
    return FilmStack(stack.grid, films, stack.surface)


def test_a_fair_change_has_no_faults(pair):
    before, after = pair
    assert list(invariants.changed_films(before, after, {0, 1})) == []
    assert list(invariants.lowered(before, after)) == []
    assert list(invariants.grown(before, after)) == []


def test_a_film_that_was_to_stay_and_changed_is_named(pair):
    before, after = pair
    low = before.films[1]
    changed = with_films(after, low=replace(low, top=low.top.copy()))
    (fault,) = invariants.changed_films(before, changed, {0, 1})
    assert "'low' changed" in fault


def test_a_lowered_field_and_a_grown_film_are_named(pair):
    before, after = pair
    high = before.films[2]
    grown = with_films(after, high=replace(high, top=high.top - np.float32(0.2)))
    assert "top field of film 'high'" in next(invariants.lowered(before, grown))
    assert "grew" in next(invariants.grown(before, grown))


def test_what_was_gone_may_not_come_back(pair):
    _, after = pair
    high = after.films[after.index("high")]
    removed = np.ascontiguousarray(np.broadcast_to(2 - after.grid.x, after.grid.shape), np.float32)
    cut = after.carve({after.index("high"): removed})
    back = with_films(cut, high=replace(high, gone=None))
    assert "gone field of film 'high'" in next(invariants.lowered(cut, back))


def test_the_switch_switches(pair, monkeypatch):
    before, _ = pair
    bad = replace(before.films[2], step=9, top=before.surface + np.float32(1.0))
    monkeypatch.delenv(invariants.SWITCH)
    before.add(bad)
    monkeypatch.setenv(invariants.SWITCH, "1")
    with pytest.raises(invariants.BrokenInvariantError, match="add: the top of film 'high'"):
        before.add(bad)


def test_a_field_that_is_no_distance_is_seen():
    """The square of a height slopes by twice the height: off by up to six within three cells."""
    grid = stacks.even_grid(8, -8, 8)
    height = np.broadcast_to(grid.z[:, None, None], grid.shape)
    off, smooth = invariants.off_gradient(1.2 * height, grid)
    assert off[smooth] == pytest.approx(0.2, abs=1e-6)
    assert smooth.sum() > 8
