"""Isotropic etches: what they leave of a film, how they pass into the next one, and amounts by `clears` and `until`."""
import pytest

from tests import stacks
from tests.unit.steps.shop import cut_of, do, layered

GLASS_ON_NITRIDE = (("nitride", "low-stress nitride", None, 0.6), ("glass", "psg", "as deposited", 2.1))
OWN = {"psg": "1 um/min", "low-stress nitride": "5 nm/min", "silicon": "0 nm/min"}


@pytest.mark.parametrize("height", [0.2, 0.45, 0.8])
@pytest.mark.parametrize("how", [{"clears": "glass"}, {"until": "nitride"}])
def test_clearing_takes_the_films_thickness_and_the_overetch_its_share(height, how):
    """2.1 um at 1 um/min and 20 % over: 151.2 s, and nothing of the glass is left."""
    wafer = do(layered(*GLASS_ON_NITRIDE, height=height), "etch", with_="hf 49", over="20 %", rates=OWN, **how)
    assert cut_of(wafer).time == pytest.approx(151.2, rel=0.01)
    assert wafer.stack.index("glass") is None


@pytest.mark.parametrize("thick", [0.3, 0.6, 1.0, 1.7])
def test_a_thin_film_is_cleared(thick):
    wafer = do(layered(("nitride", "low-stress nitride", None, 0.6), ("glass", "psg", None, thick)), "etch",
               with_="hf 49", clears="glass", over="10 %", rates=OWN)
    assert stacks.thickness(wafer.stack, "glass", 6.0) == 0.0


@pytest.mark.parametrize("height", [0.05, 0.2, 0.45, 0.6, 0.8])
@pytest.mark.parametrize("upper", [0.2, 0.4, 1.0, 1.6])
@pytest.mark.parametrize("depth", [0.3, 0.7, 1.1, 2.0])
def test_a_front_passes_through_one_film_into_the_next(height, upper, depth):
    """Both at 1 um/s: the lower film is `depth` deep etched `depth` seconds after the upper one is through, to 0.02."""
    from flowemu.steps.models.coating import coat

    stack = coat(coat(stacks.bare(stacks.even_grid(12, -4, 14), height), stacks.blank("low"), 3.0),
                 stacks.blank("up", step=2), upper)
    etched = stacks.wet_etch(stack, {"up": 1.0, "low": 1.0}, upper + depth)
    assert etched.index("up") is None
    assert 3.0 - stacks.thickness(etched, "low", 6.0) == pytest.approx(depth, abs=0.02)


@pytest.mark.parametrize("height", [0.2, 0.45, 0.8])
@pytest.mark.parametrize("left", [0.1, 0.3, 0.5, 0.7, 0.9])
@pytest.mark.parametrize("under", [False, True])
def test_what_an_etch_leaves_of_a_film_is_exact(height, left, under):
    """2.1 um less rate x time, to 0.01, with another film below it or the wafer."""
    from flowemu.steps.models.coating import coat

    stack = stacks.bare(stacks.even_grid(12, -4, 14), height)
    stack = coat(stack, stacks.blank("under"), 0.6) if under else stack
    stack = coat(stack, stacks.blank("film", step=2), 2.1)
    etched = stacks.wet_etch(stack, {"film": 1.0}, 2.1 - left)
    assert stacks.thickness(etched, "film", 6.0) == pytest.approx(left, abs=0.01)
