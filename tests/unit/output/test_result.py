"""`result.json` and the end of a run."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from flowemu.findings import Finding
from flowemu.output.end_of_run import summary
from flowemu.output.result import result_text
from flowemu.record import FilmRow, FreeRow, PartRow, RunRecord, StepRow, WindowRow
from flowemu.stack.grid import Grid

OUT = Path("outputs/comb")
ERROR = Finding(
    "missing-anchor", "error", 7, "poly1", "comb", (12.0, 0.5, 3.0), "comb is adrift.", "It rested on glass1."
)
NOTE = Finding("rate-assumed", "note", None, None, None, None, "psg rate from memory.", "")


def record(**changes) -> RunRecord:
    """A short run with one loose part and one error."""
    plain = {
        "flow": "Comb",
        "version": "0.1.0",
        "revision": "abcdef0123456789",
        "masks_sha256": "0123456789abcdef",
        "grid": Grid(-5.0, -5.0, 0.5, 20, 20, np.linspace(-4.0, 4.0, 17)),
        "steps": (StepRow(1, "deposit", None, None, 0.0, 200.0), StepRow(2, "release", "free it", 900.0, 180.0, 0.0)),
        "films": (FilmRow("wafer", "silicon", 0, np.float32(400.0)),),
        "parts": (
            PartRow("pin", ("poly2",), 20.0, (-1, -1, 0, 1, 1, 4), "held", 6.25),
            PartRow("comb", ("poly1",), 50.0, None, "captive", None, (0.6, 0.6, 0.6, 0.6, 0.0, np.inf)),
        ),
        "findings": (NOTE, ERROR),
        "masks": {"ANCHOR": [], "PLATE": []},
        "expectations": (2, 3),
        "run_seconds": 12.3,
    }
    return RunRecord(**{**plain, **changes})


def test_result_has_the_published_keys_in_order() -> None:
    result = json.loads(result_text(record(windows=(WindowRow(2, "glass1", 600.0, 900.0),))))
    assert list(result) == ["flow", "version", "masks_sha256", "grid", "steps", "films", "parts", "windows", "findings"]
    assert result["grid"] == {"cell_um": 0.5, "shape_zyx": [16, 20, 20], "cells": 6400}
    keys = {name: list(result[name][0]) for name in ("steps", "films", "parts", "windows")}
    assert keys == {
        "steps": ["index", "verb", "name", "seconds", "removed_um3", "added_um3"],
        "films": ["name", "material", "step", "volume_um3"],
        "parts": ["name", "films", "volume_um3", "box_um", "state", "contact_um2", "play_um"],
        "windows": ["step", "film", "clears_s", "ends_s", "limit_s", "limited_by"],
    }
    told = ["code", "severity", "step", "film", "part", "at_um", "text", "cause"]
    assert list(result["findings"][0])[: len(told)] == told


def test_what_does_not_apply_is_null_and_what_is_endless_too() -> None:
    result = json.loads(result_text(record()))
    assert result["windows"] == []
    assert result["steps"][0]["name"] is None
    assert result["parts"][0]["play_um"] is None
    assert result["parts"][1]["play_um"] == [0.6, 0.6, 0.6, 0.6, 0.0, None]
    assert result["findings"][0]["at_um"] is None


def test_end_of_a_run_word_for_word() -> None:
    frees = (FreeRow("comb", 2, 540.0, 900.0),)
    assert summary(record(frees=frees, from_memory=("psg in hf 49",)), OUT) == [
        "flow     Comb, revision abcdef01, masks 01234567",
        "window   10 x 10 um, cell 0.5 um, 20 x 20 x 16 = 6,400 cells",
        "verdict  NOT READY: 1 error, 0 warnings, 1 note, 0 waived; 2 steps in 12 s",
        "error    missing-anchor, step 7 at (12, 0.5, 3) um: comb is adrift. It rested on glass1.",
        "parts    held: pin; captive: comb (play x -0.6 +0.6, y -0.6 +0.6, z -0 open um)",
        "release  comb comes free after 9 min of the planned 15 min",
        "masks    ANCHOR, PLATE",
        "expected 2 of 3 hold",
        "rates    from memory: psg in hf 49",
        "next     flowemu explain missing-anchor; results in outputs/comb",
    ]


@pytest.mark.parametrize(("fail_on", "word"), [("error", "READY"), ("warning", "READY"), ("note", "NOT READY")])
def test_verdict_goes_by_the_least_severity(fail_on: str, word: str) -> None:
    lines = summary(record(findings=(NOTE, ERROR.waive())), OUT, fail_on)
    assert f"verdict  {word}: 0 errors, 0 warnings, 1 note, 1 waived" in lines[2]
    assert not any(line.startswith("error") for line in lines)


def test_many_findings_are_counted_not_listed() -> None:
    lines = summary(record(findings=(ERROR,) * 9), OUT)
    assert sum(line.startswith("error") for line in lines) == 6
    assert "         and 3 more in result.json" in lines


def test_part_that_does_not_come_free_is_said() -> None:
    lines = summary(record(frees=(FreeRow("pin", 2, 60.0, 900.0), FreeRow("comb", 2, None, 900.0))), OUT)
    assert "release  comb does not come free in the planned 15 min" in lines
