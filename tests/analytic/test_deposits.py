"""Deposited films against closed forms: flats, corners, trenches, thin walls. Errors are in cells along the normal."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.stack.grid import Grid
from flowemu.stack.stack import FilmStack
from flowemu.steps.models.coating import coat
from tests import stacks

FAN = np.radians(np.linspace(2, 88, 40))


@pytest.mark.parametrize("thickness", [0.01, 0.05, 0.1, 0.3, 1.0, 2.3, 7.7])
def test_a_flat_film_has_its_thickness_wherever_the_planes_lie(thickness):
    """t to 0.01 cell on either side, and to 2 % of itself below a cell."""
    for height in (0.0, 0.13, 0.5, 0.77):
        stack = coat(stacks.bare(stacks.even_grid(4, -5, 14), height), stacks.blank("film"), thickness)
        error = stacks.thickness(stack, "film", 2.0) - thickness
        assert abs(error) < min(0.01, 0.02 * thickness)


def test_flat_films_do_not_drift_when_they_pile_up_on_graded_planes():
    """Twelve films of 0.83 um on planes that widen by a fifth each: every one to 0.01 of the least cell."""
    grid = Grid(0.0, 0.0, 1.0, 4, 1, np.cumsum(1.2 ** np.arange(14.0)) - 6.0)
    stack = stacks.bare(grid, 0.1)
    for k in range(12):
        stack = coat(stack, stacks.blank(f"film {k}", step=k + 1), 0.83)
    found = [high - low for _, low, high in stacks.layers(stack, 2.0)[1:]]
    assert found == pytest.approx([0.83] * 12, abs=0.01)


def step(cell: float, corner: tuple[float, float], width: float, height: float) -> FilmStack:
    """A wafer with a block, whose upper right corner is `corner` (x, z), on a floor at z = 0; exact distances."""
    grid = stacks.even_grid(round(width / cell), -4, height, cell)

    def inside(x, z):
        a, b = x - corner[0], z - corner[1]
        block = np.where((a > 0) & (b > 0), np.hypot(a, b), np.maximum(a, b))
        return np.minimum(block, z + 0 * x)

    return stacks.trenched(grid, inside)


def corner_errors(cell: float, thickness: float) -> np.ndarray:
    """Radius of the film round a corner, less the thickness, um, over a fan and three places of the corner."""
    out = []
    for corner in ((14.3, 12.2), (14.05, 12.5), (14.71, 12.93)):
        stack = coat(step(cell, corner, 30, 24), stacks.blank("film"), thickness)
        top = stacks.film_of(stack, "film").top
        out.append(stacks.reach(top, stack.grid, corner, FAN, thickness + 3) - thickness)
    return np.concatenate(out)


@pytest.mark.parametrize("thickness", [0.3, 0.6, 1.0, 1.9, 2.0, 3.0, 5.0, 8.0])
def test_a_conformal_film_is_round_at_an_outer_corner(thickness):
    """Radius = thickness: to 0.1 cell from two cells on, to 0.3 below, on either side."""
    error = np.abs(corner_errors(1.0, thickness))
    assert error.max() < (0.1 if thickness >= 2 else 0.3)


@pytest.mark.parametrize("thickness", [1.0, 2.0, 3.0])
def test_halving_the_cell_helps_at_a_corner(thickness):
    """The mean error falls at least 1.7-fold, by the rule for cases with corners."""
    coarse, fine = (np.abs(corner_errors(cell, thickness)).mean() for cell in (1.0, 0.5))
    assert coarse > 1.7 * fine


def test_halving_the_cell_helps_on_a_smooth_floor():
    """A round ridge, radius 8, takes 3 um: the film's radius is 11; second order, so the mean falls 3-fold or more."""

    def mean_error(cell):
        stack = stacks.trenched(stacks.even_grid(round(30 / cell), -16, 16, cell), ridge)
        stack = coat(stack, stacks.blank("film"), 3.0)
        angles = np.radians(np.linspace(10, 170, 60))
        found = stacks.reach(stacks.film_of(stack, "film").top, stack.grid, (15.2, -0.3), angles, 14)
        return np.abs(found - 11.0).mean()

    def ridge(x, z):
        return np.hypot(x - 15.2, z + 0.3) - 8.0

    coarse, fine = mean_error(1.0), mean_error(0.5)
    assert coarse < 0.02
    assert coarse > 3 * fine


def test_a_conformal_film_lines_a_trench():
    """A trench 12 wide and 9 deep takes 2.6 um: walls and floor to 0.02 cell, the inner corner sharp."""
    grid = stacks.even_grid(30, -14, 10)
    left, right, floor = 9.3, 21.3, -9.2

    def inside(x, z):
        into = np.minimum(x - left, right - x) + 0 * z  # positive between the walls
        hole = np.minimum(into, z - floor)
        above = np.where(into > 0, np.hypot(into, z), z)
        buried = np.minimum(-z + 0 * x, np.hypot(np.maximum(-into, 0), np.maximum(floor - z, 0)))
        return np.where(z > 0, above, np.where(hole > 0, hole, -buried))

    stack = coat(stacks.trenched(grid, inside), stacks.blank("film"), 2.6)
    top = stacks.film_of(stack, "film").top
    assert stacks.thickness(stack, "film", 15.3) == pytest.approx(2.6, abs=0.02)
    walls = stacks.crossings(stacks.value_at(top, grid, grid.x, np.full(grid.nx, -4.0)), grid.x)
    assert walls == pytest.approx([left + 2.6, right - 2.6], abs=0.02)


def test_a_film_closes_a_trench_and_seals_nothing_that_it_fills():
    """A trench 6 wide is full after 3 um and stays so: no void is left in its middle column."""
    grid = stacks.even_grid(30, -14, 12)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("base"), 8.0)
    stack = stacks.printed(stack, 3.0 - np.abs(grid.x - 15.0))
    stack = stacks.stripped(stacks.beam_etch(stack, {"base": 1.0}, 8.5))
    stack = coat(stack, stacks.blank("fill"), 3.4)
    filled = [layer for layer in stacks.layers(stack, 15.0) if layer[0] == "fill"]
    assert len(filled) == 1
    assert filled[0][1] == pytest.approx(0.2, abs=0.01)


@pytest.mark.parametrize("coverage", [0.4, 0.6, 0.85])
@pytest.mark.parametrize("thickness", [1.6, 3.0])
def test_coverage_thins_the_walls(coverage, thickness):
    """Thickness t on flats and c t on upright walls, to 0.1 cell; flats to 0.01."""
    corner = (14.3, 12.2)
    stack = coat(step(1.0, corner, 30, 24), stacks.blank("film"), thickness, coverage)
    top, grid = stacks.film_of(stack, "film").top, stack.grid
    wall = stacks.crossings(stacks.value_at(top, grid, grid.x, np.full(grid.nx, 8.0)), grid.x)[0] - corner[0]
    assert wall == pytest.approx(coverage * thickness, abs=0.1)
    for x in (5.0, 26.0):
        assert stacks.thickness(stack, "film", x) == pytest.approx(thickness, abs=0.01)


@pytest.mark.parametrize("coverage", [0.5, 0.7])
def test_coverage_rounds_a_corner_to_an_ellipse(coverage):
    """From the corner the film reaches the ellipse of half axes (c t, t), along its normal to 0.6 cell (seen: 0.54)."""
    thickness, corner = 4.0, (14.3, 12.2)
    stack = coat(step(1.0, corner, 30, 24), stacks.blank("film"), thickness, coverage)
    found = stacks.reach(stacks.film_of(stack, "film").top, stack.grid, corner, FAN, 8)
    across, up = np.cos(FAN) / (coverage * thickness), np.sin(FAN) / thickness
    exact = 1 / np.hypot(across, up)
    normal = np.array([across / (coverage * thickness), up / thickness])
    lean = (normal * np.array([np.cos(FAN), np.sin(FAN)])).sum(axis=0) / np.hypot(*normal)
    assert np.abs((found - exact) * lean).max() < 0.6


def test_a_film_over_a_sealed_void_does_not_get_into_it():
    """A void under a closed roof stays as it is, to the bit; the roof takes the film."""
    grid = stacks.even_grid(30, -6, 16)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("sac"), 3.0)
    stack = stacks.printed(stack, np.abs(grid.x - 15.0) - 6.0)
    stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0}, 3.3))
    stack = coat(stack, stacks.blank("roof"), 1.5)
    buried = stack.without({stack.index("sac")})
    before = stacks.layers(buried, 15.0)
    coated = coat(buried, stacks.blank("film"), 1.0)
    after = stacks.layers(coated, 15.0)
    assert [name for name, _, _ in after] == ["wafer", "roof", "film"]
    assert after[:2] == before
    assert after[1][1] - after[0][2] == pytest.approx(3.0, abs=0.01)


@pytest.mark.parametrize("coverage", [1.0, 0.6])
@pytest.mark.parametrize("thickness", [0.1, 0.2, 0.4, 0.7])
def test_a_thin_film_over_a_step_is_nowhere_open(thickness, coverage):
    """Whatever lies under it is not etched: at no corner does the old film poke through the new one."""
    rng = np.random.default_rng(5)
    for _ in range(6):
        place, height, rise = rng.uniform(0, 1), rng.uniform(0, 1), rng.uniform(0.5, 4)
        grid = stacks.even_grid(20, -4, 12)
        stack = coat(stacks.bare(grid, height), stacks.blank("glass"), rise)
        stack = stacks.printed(stack, grid.x - 9.0 - place)
        stack = stacks.stripped(stacks.beam_etch(stack, {"glass": 1.0}, 1.1 * rise))
        stack = coat(stack, stacks.blank("skin"), thickness, coverage)
        _, times = stacks.front(stack, {"glass": 1.0}).of_film(1)
        assert not np.isfinite(times).any()


def test_a_thick_film_after_many_steps_leaves_nothing_afloat():
    """Films of 1.1 and 5.3 cells after a resist came and went: one film on the other and nothing above them."""
    grid = stacks.even_grid(20, -4, 12)
    stack = coat(stacks.bare(grid, 0.2), stacks.blank("low"), 2.3)
    stack = stacks.stripped(stacks.printed(stack, grid.x - 9.3))
    stack = coat(coat(stack, stacks.blank("thin", step=2), 1.1), stacks.blank("thick", step=3), 5.3)
    for x in (3.0, 9.3, 16.0):
        assert [name for name, _, _ in stacks.layers(stack, x)] == ["wafer", "low", "thin", "thick"]


@pytest.mark.parametrize("cell", [0.25, 0.3, 0.7])
def test_films_many_cells_thick_follow_each_other_at_any_cell(cell):
    """Two glasses of 12 and 8 cells, at 60 % coverage and conformal: thickness exact, and void above at the band."""
    grid = stacks.even_grid(8, -3 * cell, 34 * cell, cell)
    stack = coat(stacks.bare(grid, 0.3 * cell), stacks.blank("lower"), 12 * cell, 0.6)
    stack = coat(stack, stacks.blank("upper"), 8 * cell)
    for name, thickness in (("lower", 12 * cell), ("upper", 8 * cell)):
        assert stacks.thickness(stack, name, 4 * cell) == pytest.approx(thickness, abs=0.01 * cell)
    assert stack.surface.max() == pytest.approx(stack.band, rel=0.01)
