"""A part adrift without an opening of the anchor's mask below it, and the situations in which that is not so."""

from __future__ import annotations

import re

import pytest

from tests.unit.checks.situations import cut, laid, loosened, loss, printed, saying

missing = saying("missing anchor")
OPENING = cut(loss("glass", through=True, meant=True), step=3, mask="ANCHOR")
RELEASED = cut(loss("glass", meant=True), step=11, verb="release")


def test_the_finding_names_part_mask_distance_place_and_what_took_the_support() -> None:
    """The part ends at x = 9, the opening begins at 12: 3 um apart."""
    (finding,) = missing(printed(13.0), OPENING, laid("glass"), RELEASED, loosened())
    assert (finding.code, finding.severity, finding.part, finding.film) == ("missing-anchor", "error", "plate", "poly")
    assert (finding.step, finding.at_um) == (11, (7.0, 7.0, 3.0))
    assert finding.size_um == pytest.approx(3.0)
    assert re.fullmatch(
        r"part plate \(poly\) is adrift: no opening of mask ANCHOR \(step 2\) lies under it; "
        r"the nearest is 3\.0 um away, towards \(12\.5, [4-9]\.5\) um\.",
        finding.text,
    )
    assert finding.cause == (
        "It rested on glass alone, which step 11 (release, hf 49) took away. Draw an opening of ANCHOR inside the "
        "part, so that its film reaches what lies below glass."
    )


def test_the_nearest_of_two_masks_is_named() -> None:
    other = cut(loss("glass", through=True, meant=True), step=4, mask="VIA")
    events = printed(13.0), OPENING, printed(2.0, 3, "VIA"), other, laid("glass"), RELEASED, loosened()
    assert "mask VIA (step 3)" in missing(*events)[0].text


@pytest.mark.parametrize(
    "events",
    [
        (printed(13.0), OPENING, laid("glass"), RELEASED),
        (printed(13.0), OPENING, laid("glass"), RELEASED, loosened(state="captive")),
        (printed(13.0), OPENING, laid("glass"), RELEASED, loosened(sliver=True)),
        (printed(7.0), OPENING, laid("glass"), RELEASED, loosened()),
        (laid("glass"), RELEASED, loosened()),
        (printed(13.0), OPENING, laid("glass", step=2), RELEASED, loosened()),
        (printed(13.0), cut(loss("glass"), step=3, mask="ANCHOR"), laid("glass"), RELEASED, loosened()),
        (printed(13.0), OPENING, laid("nitride"), RELEASED, loosened()),
        (printed(13.0), OPENING, RELEASED, loosened()),
    ],
    ids=["nothing loose", "captive", "sliver", "opening below", "no mask", "laid before the opening", "not cut through",
         "rests on another film", "support unknown"],
)  # fmt: skip
def test_silent(events: tuple[object, ...]) -> None:
    assert missing(*events) == []
