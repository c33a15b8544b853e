"""A run does not depend on how many threads it has: every field comes out the same, bit for bit."""

from __future__ import annotations

import hashlib
import os
import subprocess
import sys
from pathlib import Path

import numpy as np

from tests.end_to_end.conftest import ROOT
from tests.unit.engine.runs import EXPECT, HEAD, PARTS, STEPS, flow_from

WINDOW = "window: [-24 um, -22 um, 24 um, 22 um]"
COARSE = HEAD.replace("window: [-30 um, 0 um, 30 um, 0.5 um]", WINDOW).replace("cell: 0.5 um", "cell: 1 um")
SHORT = STEPS.replace("frees: [plate], over: 20 %", "time: 6 min")


def fields(flow_file: str) -> str:
    """One line a field of every structure of a run: its step, film, name and hash."""
    from flowemu.engine.run import run_flow
    from flowemu.flow.load import load_flow

    flow = load_flow(flow_file, ())
    run = run_flow(flow, keep=tuple(range(1, len(flow.steps))))
    lines = []
    for shot in run.record.shots:
        named = [("surface", shot.stack.surface)]
        for film in shot.stack.films:
            named += [(f"{film.name} {name}", getattr(film, name)) for name in ("top", "floor", "gone")]
        for name, field in named:
            if field is not None:
                digest = hashlib.sha256(np.ascontiguousarray(field).tobytes()).hexdigest()
                lines.append(f"step {shot.step}: {name}: {digest}")
    lines += [f"{f.code} {f.text}" for f in run.record.findings]
    return "\n".join(lines)


def printed_with(threads: int, flow_file: Path) -> str:
    """The same from an interpreter of its own with this many threads."""
    done = subprocess.run(
        [sys.executable, "-m", "tests.end_to_end.test_threads", str(flow_file)],
        cwd=ROOT, env={**os.environ, "NUMBA_NUM_THREADS": str(threads)}, capture_output=True, text=True, timeout=300,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_one_thread_and_two_give_the_same_bits() -> None:
    """A plate on a post in three dimensions, patterned, etched and released in part."""
    path = flow_from(COARSE + SHORT + PARTS + EXPECT).path
    one, two = printed_with(1, path), printed_with(2, path)
    assert len(one.splitlines()) > 40
    assert one.splitlines() == two.splitlines()


if __name__ == "__main__":
    print(fields(sys.argv[1]))
