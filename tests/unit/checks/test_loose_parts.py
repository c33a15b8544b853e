"""Loose parts: captive with their play, adrift, cut by the window; slivers are told together."""

from __future__ import annotations

import pytest

from tests.unit.checks.situations import cut, laid, loosened, loss, printed, saying

loose = saying("loose parts")
CENTRE = (7.0, 7.0, 3.0)


def test_nothing_loose_is_nothing_said() -> None:
    assert loose() == []
    assert loose(cut(loss()), laid()) == []


def test_a_captive_part_is_a_note_with_its_play() -> None:
    play = (0.5, 0.5, 0.25, 1.0, 0.1, None)
    (finding,) = loose(loosened(state="captive", play=play, searched="all was tried"))
    assert (finding.code, finding.severity, finding.part, finding.film) == ("part-captive", "note", "plate", "poly")
    assert finding.at_um == CENTRE
    assert finding.text == (
        "part plate (poly) is loose but cannot leave; its play is x -0.5 +0.5, y -0.25 +1, z -0.1 +open um"
    )
    assert finding.cause == "all was tried."


def test_an_adrift_part_is_an_error_with_what_took_its_support() -> None:
    release = cut(loss("glass", meant=True), step=11, verb="release")
    (finding,) = loose(laid("glass"), release, loosened(films=("poly", "metal")))
    assert (finding.code, finding.severity, finding.step) == ("part-adrift", "error", 11)
    assert finding.text == "part plate (poly and metal) is adrift after step 11 (release, hf 49)"
    assert finding.cause == (
        "It rested on glass, which step 11 (release, hf 49) took away, and it can leave straight up."
    )


def test_an_adrift_part_of_unknown_support_says_how_it_leaves() -> None:
    (finding,) = loose(loosened())
    assert finding.cause == "Nothing joins it to the wafer, and it can leave straight up."


@pytest.mark.parametrize(("x", "count"), [(13.0, 0), (7.0, 1)])
def test_a_part_that_lacks_its_anchor_is_left_to_missing_anchor(x: float, count: int) -> None:
    """An opening at 13 um lies beside the part: that check tells it. One at 7 um lies under it: this one does."""
    opening = cut(loss("glass", through=True, meant=True), step=3, mask="ANCHOR")
    release = cut(loss("glass", meant=True), step=11, verb="release")
    found = loose(printed(x), opening, laid("glass"), release, loosened())
    assert [f.code for f in found] == ["part-adrift"] * count


def test_a_part_at_the_windows_edge_is_a_note() -> None:
    (finding,) = loose(loosened(state="cut by the window", play=None, searched="its end lies outside the window"))
    assert (finding.code, finding.severity) == ("part-cut-by-window", "note")
    assert "cut by the window's edge" in finding.text


def test_the_last_word_on_a_part_counts() -> None:
    found = loose(loosened(state="captive", play=(1.0,) * 6), loosened(state="adrift"))
    assert [f.code for f in found] == ["part-adrift"]


def test_slivers_are_told_together_by_film_with_the_largest() -> None:
    slivers = [
        loosened(f"poly piece {k}", sliver=True, volume=0.1 * k, box=(k, 0, 0, k + 2, 2, 2)) for k in (1, 2, 3)
    ]
    other = loosened("glass piece 4", sliver=True, films=("glass",), volume=0.5)
    found = loose(*slivers, other)
    assert [(f.code, f.severity, f.film) for f in found] == [
        ("loose-residue", "warning", "glass"), ("loose-residue", "warning", "poly"),
    ]  # fmt: skip
    assert found[0].text.startswith("a sliver of film glass came loose")
    assert found[1].text == "3 slivers of film poly came loose in step 11 (release, hf 49); the largest is 0.3 um3"
    assert found[1].at_um == (4.0, 1.0, 1.0)
