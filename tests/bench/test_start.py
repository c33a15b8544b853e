"""How fast the command line starts, against an interpreter that imports click and pydantic, least of five."""

from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path

ROOT = Path(__file__).parents[2]
UNIT = (sys.executable, "-c", "import click, pydantic; pydantic.BaseModel")
HELP = (sys.executable, "-m", "flowemu", "--help")
LINT = (sys.executable, "-m", "flowemu", "lint", "flows/comb.yaml")
MOST_HELP, MOST_LINT = 2.5, 6.0


def seconds(command: tuple[str, ...]) -> float:
    """How long a command takes."""
    began = time.perf_counter()
    subprocess.run(command, cwd=ROOT, stdout=subprocess.DEVNULL, check=True)
    return time.perf_counter() - began


def test_help_and_lint_start_fast() -> None:
    rounds = [[seconds(command) for command in (UNIT, HELP, LINT)] for _ in range(5)]
    unit, help_, lint = (min(times) for times in zip(*rounds, strict=True))
    print(f"\nunit {unit:.3f} s, help {help_ / unit:.2f} of {MOST_HELP}, lint {lint / unit:.2f} of {MOST_LINT}")
    assert help_ / unit <= MOST_HELP
    assert lint / unit <= MOST_LINT
