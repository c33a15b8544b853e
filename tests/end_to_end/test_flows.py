"""The flows of the demonstration die come out as planned, by the program's own word.

Values by hand stand in the comments of the flow files: drawn sizes and film thicknesses. A tenth of a cell is 0.05 um.
"""

from __future__ import annotations

import re
from collections.abc import Callable

import pytest

from tests.end_to_end.conftest import Done

Ran = Callable[[str], Done]
TENTH_OF_A_CELL = 0.05  # um
CELL = 0.5  # um


def test_the_comb_is_ready_with_its_fingers_free_and_its_anchors_held(ran: Ran) -> None:
    done = ran("comb")
    assert done.status == 0, done.err
    assert done.found("error") == []
    assert {part["name"]: part["state"] for part in done.result["parts"]} == {
        "shuttle": "held",
        "comb_left": "held",
        "comb_right": "held",
    }
    assert "glass" not in [film["name"] for film in done.result["films"]]
    assert re.search(r"^release  shuttle comes free after .* of the planned", done.out, re.MULTILINE)
    assert re.search(r"^expected 7 of 7 hold$", done.out, re.MULTILINE)


def test_the_comb_stands_on_its_drawn_anchors(ran: Ran) -> None:
    """Contact areas by hand: two anchors of 6 x 6 um a spring, four in all; one of 4 x 28 um a fixed comb."""
    done = ran("comb")
    assert done.part("shuttle")["contact_um2"] == pytest.approx(4 * 6 * 6, rel=0.02)
    assert done.part("comb_right")["contact_um2"] == pytest.approx(4 * 28, rel=0.02)


def test_the_missing_anchor_is_the_one_error_and_is_explained(ran: Ran) -> None:
    done = ran("comb_unanchored")
    assert done.status == 1, done.err
    (error,) = done.found("error")
    assert (error["code"], error["part"], error["film"], error["step"]) == ("missing-anchor", "comb_right", "poly1", 18)
    assert "comb_right" in error["text"]
    assert "mask ANCHOR (step 10)" in error["text"]
    distance = re.search(r"the nearest is ([0-9.]+) um away", error["text"])
    assert distance is not None
    assert float(distance.group(1)) == pytest.approx(23.0, abs=TENTH_OF_A_CELL)
    assert "step 18 (release, hf 49) took away" in error["cause"]
    assert "glass" in error["cause"]
    states = {part["name"]: part["state"] for part in done.result["parts"]}
    assert states["comb_right"] == "adrift"
    assert states["shuttle"] == states["comb_left"] == "held"


def test_the_rotor_is_captive_with_the_play_worked_out_by_hand(ran: Ran) -> None:
    done = ran("rotor")
    assert done.status == 0, done.err
    assert done.found("error") == []
    assert done.part("pin")["state"] == "held"
    rotor = done.part("rotor")
    assert rotor["state"] == "captive"
    *sideways, down, up = rotor["play_um"]
    assert sideways == pytest.approx([0.6] * 4, abs=TENTH_OF_A_CELL)
    assert up == pytest.approx(1.0, abs=TENTH_OF_A_CELL)
    assert down == pytest.approx(1.0 + eaten_nitride(done), abs=TENTH_OF_A_CELL)


def eaten_nitride(done: Done) -> float:
    """Nitride that the release takes below the dimples, um: 5 nm/min for the time since they came free."""
    release = next(step for step in done.result["steps"] if step["verb"] == "release")
    return 0.005 * float(release["seconds"]) / 60.0


def test_the_short_release_is_the_one_error_and_says_what_is_left_where_and_for_how_long(ran: Ran) -> None:
    """By hand: HF has 100 s of the 127 s that 7.6 um at 3.6 um/min take; the last is left at radii of 9 to 12 um.

    Behind a dimple and beside a spoke the way is longer by up to the dimple's radius of 1.25 um, 20 s.
    """
    done = ran("rotor_short_release")
    assert done.status == 1, done.err
    (error,) = done.found("error")
    assert (error["code"], error["part"], error["film"], error["step"]) == ("part-not-free", "rotor", "glass1", 19)
    x, y, z = error["at_um"]
    assert 9.0 <= (x * x + y * y) ** 0.5 <= 12.0
    assert 0.6 <= z <= 2.6
    left = re.search(r"([0-9.]+) s more are needed", error["text"])
    assert left is not None
    assert 25.0 <= float(left.group(1)) <= 47.0
    assert {part["name"]: part["state"] for part in done.result["parts"]}["rotor"] == "held"


@pytest.mark.parametrize("name", ["comb", "comb_unanchored", "rotor", "rotor_short_release"])
def test_a_run_ends_in_about_twelve_lines(ran: Ran, name: str) -> None:
    done = ran(name)
    lines = done.out.splitlines()
    assert 8 <= len(lines) <= 14
    assert [line.split()[0] for line in lines[:3]] == ["flow", "window", "verdict"]
    assert ("NOT READY" in lines[2]) == (done.status == 1)
    assert lines[-1].startswith("next ")
    assert str(done.folder.relative_to(done.folder.parents[1])) in lines[-1]
    assert "Traceback" not in done.err
    assert all(re.match(r"\d+/\d+ ", line) for line in done.err.splitlines())
