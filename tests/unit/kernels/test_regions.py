"""Codes, edges, pieces and bodies beside their plain twins; small grids, so that it runs uncompiled too."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import regions
from flowemu.stack.topology import FieldTable, film_codes
from tests import naive_regions as naive

BOUNDS = [(0, -1, -1), (1, 6, 2), (3, 7, -1), (4, 8, 5)]  # a wafer and three films over one another, two of them cut
TI, BI, GI = (np.array(column) for column in zip(*BOUNDS, strict=True))


def nested(rng: np.random.Generator) -> np.ndarray:
    """Values of nine fields at a sample: each floor a little off the top below it, so that no film beds on another."""
    tops = 1.5 - np.cumsum(rng.uniform(0, 1, 4)) + rng.normal()
    floors = tops[:3] - rng.uniform(0.01, 0.1, 3)
    return np.array([tops[0], tops[1], rng.normal(), tops[2], tops[3], rng.normal(), *floors], np.float32)


def partition(a: np.ndarray, b: np.ndarray) -> list[tuple[int, float]]:
    codes, ends = np.empty(regions.MAX_INTERVALS, np.int16), np.empty(regions.MAX_INTERVALS, np.float32)
    cuts, mid = np.empty(regions.MAX_INTERVALS), np.empty(len(a))
    n = regions.partition(a, b, TI, BI, GI, codes, ends, cuts, mid)
    return [(int(code), float(end)) for code, end in zip(codes[:n], ends[:n], strict=True)]


def test_codes_agree_with_the_twin() -> None:
    rng = np.random.default_rng(1)
    seen = set()
    for _ in range(400):
        values = nested(rng)
        code = regions.code_of(values, TI, BI, GI)
        assert code == naive.code_of(values.tolist(), BOUNDS)
        seen.add(int(code))
    assert len(seen) >= 6, "films, plain voids and voids under films"


def test_a_zero_is_outside_a_top_and_on_a_floor() -> None:
    """`top < 0 <= floor` and `gone < 0`: on its top a film is not, on its floor it is, on its cut it is not."""
    on_top = np.array([0, 1, -1, 1, 1, -1, 0, 1, 1], np.float32)
    on_floor = np.array([1, -1, -1, -1, -1, -1, 0, -1, -1], np.float32)
    on_cut = np.array([1, -1, 0, 1, 1, -1, 1, -1, 1], np.float32)
    assert [int(regions.code_of(v, TI, BI, GI)) for v in (on_top, on_floor, on_cut)] == [-1, 1, -1]


@pytest.mark.parametrize("seed", range(4))
def test_edges_are_cut_as_by_the_twin(seed: int) -> None:
    """Codes in order, and ends to 1e-5 of the edge, with and without slivers and cracks."""
    rng = np.random.default_rng(seed)
    longest = 0
    for _ in range(150):
        a, b = nested(rng), nested(rng)
        found, expected = partition(a, b), naive.intervals(a, b, BOUNDS)
        assert [code for code, _ in found] == [code for code, _ in expected]
        assert [end for _, end in found] == pytest.approx([end for _, end in expected], abs=1e-5)
        longest = max(longest, len(found))
    assert longest >= 4


def split(*ends: tuple[int, float]) -> tuple[np.ndarray, np.ndarray]:
    """Samples in film 1 and film 2 with film 1 cut at the first and film 2 beginning at the second share."""
    (_, one), (_, two) = ends
    a = np.array([1, -1, -one, -1, 1, -1, 1, -two, 1], np.float32)
    b = np.array([1, -1, 1 - one, -1, 1, -1, 1, 1 - two, 1], np.float32)
    return a, b


@pytest.mark.parametrize("thin", [0.005, 0.015, 0.03, 0.3])
def test_a_crack_between_two_films_is_closed_and_a_gap_is_not(thin: float) -> None:
    """Film 1 ends at 0.4 by its cut, film 2 begins `thin` above: a crack below 0.02 goes half to each."""
    a, b = split((1, 0.4), (2, 0.4 + thin))
    found = partition(a, b)
    assert found == [(c, pytest.approx(e, abs=1e-5)) for c, e in naive.intervals(a, b, BOUNDS)]
    closed = [(1, pytest.approx(0.4 + thin / 2, abs=1e-5)), (2, 1.0)]
    gap = [(1, pytest.approx(0.4, abs=1e-5)), (-3, pytest.approx(0.4 + thin, abs=1e-5)), (2, 1.0)]
    assert found == (closed if thin < naive.CRACK else gap)


def test_a_film_beds_on_what_it_was_laid_on() -> None:
    """Film 2's floor has film 1's top's very value at the sample in film 1, and runs clear of it by 0.3 further on."""
    a, b = split((1, 0.4), (2, 0.7))
    a[1] = a[7]  # laid on the top of film 1 ...
    a[2], b[2] = -1.0, -1.0  # ... which is not cut; its top is reached at 0.4
    a[1], b[1] = -0.7, 1.05
    assert [code for code, _ in naive.intervals(a, b, BOUNDS)] == [1, -3, 2]
    assert partition(a, b) == [(1, pytest.approx(0.4, abs=1e-5)), (2, 1.0)]


def test_painted_codes_are_those_of_each_sample() -> None:
    stack = naive.random_stack(3)
    table = FieldTable.of(stack.films)
    bounds = list(zip(table.top, table.floor, table.gone, strict=True))
    code = film_codes(stack.films, stack.grid.shape)
    for place in np.ndindex(stack.grid.shape):
        assert code[place] == naive.code_of([float(field[place]) for field in table.arrays], bounds)


def test_mixed_cells_and_near_samples_are_those_of_the_twin() -> None:
    code = np.random.default_rng(5).integers(-2, 1, (5, 4, 6)).astype(np.int16)
    code[:3, :3, :4] = 0
    mixed = regions.mixed_cells(code)
    near = np.zeros(code.shape, bool)
    assert not mixed[-1].any() and not mixed[:, -1].any() and not mixed[:, :, -1].any()
    for z, y, x in np.ndindex(*(n - 1 for n in mixed.shape)):
        assert mixed[z, y, x] == (len(np.unique(code[z : z + 2, y : y + 2, x : x + 2])) > 1)
        near[z : z + 2, y : y + 2, x : x + 2] |= mixed[z, y, x]
    assert np.array_equal(regions.near_samples(mixed), near)
    assert 0 < mixed.sum() < mixed.size


@pytest.mark.parametrize("seed", range(3))
def test_every_edge_of_a_stack_is_cut_as_by_the_twin(seed: int) -> None:
    stack = naive.random_stack(seed, n=5, cut_all=False)
    t = stack.topology
    bounds = list(zip(t.fields.top, t.fields.floor, t.fields.gone, strict=True))
    flat = t.code.reshape(-1)
    cut = 0
    for row, sample in enumerate(t.samples):
        place = np.unravel_index(sample, t.code.shape)
        for d, step in enumerate(regions.EDGE_STEPS):
            if any(p + s >= n for p, s, n in zip(place, step, t.code.shape, strict=True)):
                continue
            other = t.row_of[sample + t.strides[d]]
            if other < 0 or flat[sample] == flat[sample + t.strides[d]]:
                assert t.count[row, d] == 0
                continue
            expected = naive.intervals(t.values[row], t.values[other], bounds)
            at = t.start[7 * row + d]
            mine = slice(at, at + int(t.count[row, d]))
            assert t.interval_code[mine].tolist() == [code for code, _ in expected]
            assert t.interval_end[mine] == pytest.approx([end for _, end in expected], abs=1e-4)
            cut += 1
    assert cut > 100


def same_partition(ours: np.ndarray, theirs: np.ndarray) -> bool:
    """Whether two labellings part their members alike."""
    pairs = set(zip(ours.tolist(), theirs.tolist(), strict=True))
    return len(pairs) == len({a for a, _ in pairs}) == len({b for _, b in pairs})


@pytest.mark.parametrize("seed", range(5))
def test_pieces_and_bodies_are_those_of_a_finer_lattice(seed: int) -> None:
    """Films of 0.3 cell and more on a lattice 12 times as fine: samples are parted alike."""
    fine = 12
    stack = naive.random_stack(seed)
    t = stack.topology
    code = naive.refined_codes(stack, fine)
    beside = code[::fine, ::fine, ::fine]  # the lattice points beside the samples, a 24th of a cell away
    inner = tuple(slice(n - 1) for n in t.code.shape)
    alike = beside == np.maximum(t.code[inner], -1)
    assert alike.mean() > 0.9
    for roots, bodies in ((t.piece, False), (t.body, True)):
        ours = roots[: t.code.size].reshape(t.code.shape)[inner]
        theirs = naive.labels_of(code, bodies)[::fine, ::fine, ::fine]
        assert same_partition(ours[alike], theirs[alike])


def test_roots_are_the_lowest_members() -> None:
    """So the result knows no order: every root is its own root and lower than its members."""
    piece = naive.random_stack(2).topology.piece
    assert (piece[piece] == piece).all()
    assert (piece <= np.arange(len(piece))).all()
