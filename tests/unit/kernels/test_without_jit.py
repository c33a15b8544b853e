"""The tests of kernels and of random flows once more with the compiler switched off.

What runs uncompiled is plain Python: an index out of bounds raises there, and is not read past the array's end. Only
tests on small grids are named here, so that all of them take less than a minute.
"""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[3]
KERNELS = "tests/unit/kernels"
RUNS = {
    "marching": [f"{KERNELS}/test_march.py", "-k", "not sphere and not fmm and not exact_distance and not fair"],
    "redistancing": [f"{KERNELS}/test_redistance.py", "-k", "not ball and not gradient and not mirrors and not other"],
    "polygons and surfaces": [f"{KERNELS}/test_{name}.py" for name in ("polygon", "coating", "surface", "escape")],
    "regions and faces": [f"{KERNELS}/test_{name}.py" for name in ("regions", "faces", "starts")],
    "steps": ["tests/property/test_flows_of_steps.py", "-k", "below_a_deposit or does_nothing"],
}


@pytest.mark.parametrize("name", list(RUNS))
def test_all_holds_without_the_compiler(name: str) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "pytest", "-q", "-x", "-p", "no:cacheprovider", *RUNS[name]],
        cwd=ROOT, env={**os.environ, "NUMBA_DISABLE_JIT": "1"}, capture_output=True, text=True, timeout=300,
    )  # fmt: skip
    assert done.returncode == 0, done.stdout[-4000:] + done.stderr[-1000:]
