"""A conformal film thinner than a cell round the edges of a square hole is the mirrored one in the mirrored hole."""

from __future__ import annotations

import pytest

from flowemu.steps.models.coating import coat
from tests import stacks
from tests.property.flows import Layout
from tests.property.test_symmetry import TURNS, apart, start, turned


@pytest.mark.parametrize("name", list(TURNS))
@pytest.mark.parametrize("thickness", [0.25, 0.5, 0.9])
@pytest.mark.parametrize("offset", [0.0, 0.25, 0.5])
def test_a_thin_conformal_deposit_commutes(name, thickness, offset):
    turn = TURNS[name]
    stack = start(Layout(((1, 1, 3, 3),), offset), 0.0)
    after = coat(stack, stacks.blank("film", step=2), thickness)
    again = coat(turned(stack, turn), stacks.blank("film", step=2), thickness)
    assert apart(turned(after, turn), again).max() < 0.1
