"""The film stack under a point of a run."""

from __future__ import annotations

import pytest

from flowemu.engine.points import probe
from flowemu.errors import RunError
from tests.unit.engine.runs import finished


def test_a_gap_shows_as_heights_that_do_not_meet() -> None:
    """Beside the post the plate hangs 1 um above the wafer, which begins at minus its thickness."""
    found = probe(finished(), (10.0, 0.25))
    wafer, poly = found["stack"]
    assert (wafer["film"], wafer["from_um"]) == ("wafer", -525.0)
    assert (poly["film"], poly["from_um"], poly["to_um"]) == (
        "poly", pytest.approx(1.0, abs=0.01), pytest.approx(2.0, abs=0.01),
    )  # fmt: skip


def test_on_the_post_the_films_meet() -> None:
    wafer, poly = probe(finished(), (0.0, 0.25))["stack"]
    assert poly["from_um"] == pytest.approx(wafer["to_um"], abs=1e-6)


@pytest.mark.parametrize("at", [(-30.1, 0.2), (30.1, 0.2), (0.0, -0.1), (0.0, 0.6)])
def test_a_place_outside_the_window_is_refused(at: tuple[float, float]) -> None:
    with pytest.raises(RunError, match="lies outside the window"):
        probe(finished(), at)
