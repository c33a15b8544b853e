"""A thin film on a wall, bare at its upper end, is stripped wherever the wall stands."""
import pytest

from tests import stacks
from tests.unit.steps.shop import do
from tests.unit.steps.test_deposit import POLY, step


@pytest.mark.parametrize("height", [3.5, 3.7, 4.0, 4.2])
@pytest.mark.parametrize("edge", [15.55, 15.8, 16.05, 16.3])
def test_a_thin_film_on_a_wall_whose_end_is_bare_is_stripped(height, edge):
    sac, outer = {**POLY, "film": "sac", "thickness": "0.4 um"}, {**POLY, "film": "outer", "thickness": "3 um"}
    wafer = do(do(step(height, edge=edge), "deposit", 3, **sac), "deposit", 4, **outer)
    wafer = do(do(wafer, "polish", to="block"), "strip", film="sac")
    assert wafer.stack.index("sac") is None
    assert stacks.thickness(wafer.stack, "outer", 25.0) > 0
