"""Parts that their release should have freed: what is left, where, and the time still needed."""

from __future__ import annotations

import pytest

from flowemu.findings import Finding
from flowemu.stack.wafer import Freed
from tests.unit.checks.situations import cut, flow, saying

not_free = saying("not free")
AT = (3.5, 4.5, 1.2)


def release(time: float, part: str = "plate", **given: object) -> list[Finding]:
    return not_free(cut(step=11, verb="release", freed=(Freed(part, time, "glass", AT),)), **given)


@pytest.mark.parametrize("time", [0.0, 59.9, 60.0])
def test_a_part_that_is_free_in_time_is_silent(time: float) -> None:
    assert release(time) == []
    assert not_free() == []


@pytest.mark.parametrize(
    ("time", "says"),
    [
        (85.0, "25 s more are needed (85 s in all; 60 s are planned)"),
        (660.0, "10 min more are needed (11 min in all; 60 s are planned)"),
        (float("inf"), "the etchant never gets there"),
    ],
)
def test_the_finding_says_what_is_left_and_for_how_long(time: float, says: str) -> None:
    (finding,) = release(time)
    assert (finding.code, finding.severity, finding.step) == ("part-not-free", "error", 11)
    assert (finding.part, finding.film, finding.at_um) == ("plate", "glass", AT)
    assert finding.text == f"glass is left under part plate after step 11 (release, hf 49): {says}"
    assert finding.cause.startswith("The last of it is at (3.5, 4.5, 1.2) um")
    assert finding.cause.endswith("Open a way to it." if time == float("inf") else "or add etch holes there.")


def test_only_parts_that_are_meant_to_be_free_are_told() -> None:
    assert release(85.0, "other") == []


@pytest.mark.parametrize(("wanted", "count"), [("free", 1), ("captive", 1), ("held", 0)])
def test_an_expectation_means_a_part_to_be_free_as_well(wanted: str, count: int) -> None:
    of = flow(expect=f"expect:\n  - {wanted}: {{part: plate}}\n")
    freed = (Freed("plate", 85.0, "glass", AT),)
    found = not_free(cut(step=3, verb="release", freed=freed), of=without_frees(of))
    assert len(found) == count


def without_frees(of: object) -> object:
    """The same flow with a release that names no part, as step 3."""
    from dataclasses import replace

    release_step = of.steps[10]
    timed = release_step.settings.model_copy(update={"frees": None})
    steps = list(of.steps)
    steps[2] = replace(release_step, index=3, settings=timed)
    return replace(of, steps=tuple(steps))


def test_an_etch_frees_nothing() -> None:
    assert not_free(cut(step=8, verb="etch", freed=(Freed("plate", 85.0, "glass", AT),))) == []


def test_the_last_release_counts() -> None:
    early = cut(step=11, verb="release", freed=(Freed("plate", 85.0, "glass", AT),))
    late = cut(step=11, verb="release", freed=(Freed("plate", 20.0, "glass", AT),))
    assert not_free(early, late) == []
    assert len(not_free(late, early)) == 1
