"""Whatever the steps and the masks: the invariants hold after each, and what is taken or added has its sign.

Every add and carve is looked through by `stack.invariants` besides (see conftest.py).
"""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack
from tests import stacks
from tests.property.flows import BEAM, FLOW, PHASES, WET, Step, beginning, carried_out, volume

QUICK = settings(max_examples=7, deadline=None, derandomize=True, phases=PHASES)
HEIGHT = st.integers(0, 15).map(lambda k: k / 16)
SLACK = 1e-3  # um3, of a box of 252 (2D) or 3500 um3: rounding of float32 fields


def solid(stack: FilmStack) -> np.ndarray:
    return stack.topology.on_grid(stack.topology.code) >= 0


def fields(stack: FilmStack) -> list[np.ndarray | None]:
    return [field for film in stack.films for field in (film.top, film.floor, film.gone)]


@QUICK
@given(FLOW, HEIGHT, st.sampled_from([1, 1, 6]))
def test_steps_change_the_volume_and_the_samples_the_way_they_are_meant_to(
    steps: list[Step], height: float, ny: int
) -> None:
    """A carve never grows and an add never shrinks, in volume and at any sample; the wafer is always there."""
    stack = beginning(height, ny)
    for number, step in enumerate(steps, 1):
        after = step.run(stack, number)
        change = volume(after) - volume(stack)
        if step.adds:
            assert change >= -SLACK
            assert not (solid(stack) & ~solid(after)).any()
        elif step.kind != "print":
            assert change <= SLACK
            assert not (solid(after) & ~solid(stack)).any()
        assert after.films[0].name == "wafer"
        assert all(np.isfinite(field).all() for field in fields(after) if field is not None)
        assert np.isfinite(after.surface).all()
        stack = after


@QUICK
@given(FLOW, HEIGHT)
def test_the_surface_has_the_solids_signs(steps: list[Step], height: float) -> None:
    """At every sample the surface field is negative if and only if some film is there; zero counts as void."""
    stack = carried_out(steps, beginning(height))
    there = solid(stack)
    wrong = there != (stack.surface < 0)
    assert np.abs(stack.surface[wrong]).max(initial=0.0) < 1e-4


@QUICK
@given(FLOW, HEIGHT)
def test_films_are_disjoint_and_open_space_is_void(steps: list[Step], height: float) -> None:
    """A film's solid by its three fields is its code's, but for films that lie on one another's faces."""
    stack = carried_out(steps, beginning(height))
    code = stack.topology.on_grid(stack.topology.code)
    assert not (stack.topology.on_grid(stack.topology.open_space) & (code >= 0)).any()
    inside = np.array([inside_of(film) for film in stack.films])
    assert (inside.sum(axis=0) <= 1).all()
    assert np.array_equal(inside.any(axis=0), code >= 0)
    assert all(np.array_equal(mine, code == k) for k, mine in enumerate(inside))


def inside_of(film: Film) -> np.ndarray:
    inside = film.top < 0
    if film.floor is not None:
        inside &= film.floor >= 0
    if film.gone is not None:
        inside &= film.gone < 0
    return inside


@QUICK
@given(FLOW, HEIGHT, st.one_of(BEAM, WET))
def test_a_step_that_does_nothing_leaves_every_bit(steps: list[Step], height: float, last: Step) -> None:
    """Rates of zero, or no time: the very same arrays, by identity."""
    stack = carried_out(steps, beginning(height))
    etch = stacks.beam_etch if last.kind == "beam" else stacks.wet_etch
    still = dict.fromkeys(last.rates_of(stack), 0.0)
    for after in (etch(stack, still, last.amount), etch(stack, last.rates_of(stack), 0.0), stack.carve({})):
        assert all(a is b for a, b in zip(fields(stack), fields(after), strict=True))
        assert after.surface is stack.surface


@QUICK
@given(FLOW, HEIGHT, st.one_of(BEAM, WET))
def test_a_longer_etch_takes_no_less(steps: list[Step], height: float, last: Step) -> None:
    """The solid after 1.5 times the time has no more volume, and nothing at samples well outside the shorter one's."""
    stack = carried_out(steps, beginning(height))
    etch = stacks.beam_etch if last.kind == "beam" else stacks.wet_etch
    rates = last.rates_of(stack)
    short, long = etch(stack, rates, last.amount), etch(stack, rates, 1.5 * last.amount)
    assert volume(long) <= volume(short) + SLACK


@QUICK
@given(FLOW, HEIGHT)
def test_what_lies_below_a_deposit_keeps_its_bits(steps: list[Step], height: float) -> None:
    stack = carried_out(steps, beginning(height))
    after = Step("coat", 0.7).run(stack, 9)
    for old, new in zip(stack.films, after.films, strict=False):
        assert old is new
    assert after.films[-1].floor is stack.surface
