"""Contents of cells: no face is passed by, and what is told to be in a cell is at its corners or on its edges."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels import contents
from tests import naive_regions as naive
from tests.unit.kernels.test_faces import bare


@pytest.mark.parametrize("seed", range(4))
def test_every_cell_with_a_bare_face_is_among_those_looked_at(seed: int) -> None:
    """And at most three times as many are."""
    stack = naive.random_stack(seed)
    t = stack.topology
    source = np.zeros(2 * (len(stack.films) + 1) + 1, np.uint8)
    for k in range(len(stack.films)):
        stage = np.zeros(len(stack.films), np.uint8)
        stage[k] = 1
        _, _, number, _ = bare(stack, [k])
        chosen = contents.cells_between(t.contents, stage, source)
        assert set(np.flatnonzero(number)) <= set(chosen)
        assert len(chosen) <= 3 * max(np.count_nonzero(number), 1) + 30


@pytest.mark.parametrize("seed", range(4))
def test_the_bits_are_those_of_corners_and_edges(seed: int) -> None:
    """By a plain walk over the corners and over the inner intervals whose edge lies in the cell."""
    stack = naive.random_stack(seed)
    t = stack.topology
    code = t.code.reshape(-1)
    inner = t.inner
    for at, cell in enumerate(t.cells):
        corners = [int(cell + offset) for offset in t.corner_offsets]
        bits = {int(code[i]) if code[i] >= 0 else 63 for i in corners if code[i] >= 0 or t.is_open[t.piece[i]]}
        for row, direction, kind, node in zip(inner.row, inner.direction, inner.code, inner.node, strict=True):
            i = int(t.samples[row])
            if i in corners and int(i + t.strides[direction]) in corners and (kind >= 0 or t.is_open[t.piece[node]]):
                bits.add(int(kind) if kind >= 0 else 63)
        assert int(t.contents[at]) == sum(1 << b for b in bits)
