"""The command line on the flows of flows/, each run once, and on a small flow that is quick."""

from __future__ import annotations

import contextlib
import io
import json
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from tests.messages.cases import draw_layouts

ROOT = Path(__file__).parents[2]
HERE = Path(__file__).parent
COMMAND = (sys.executable, "-m", "flowemu")
ENVIRONMENT = {**os.environ, "PYTHONPATH": str(ROOT)}


@dataclass(frozen=True)
class Done:
    """A command that has ended: its status, what it printed, and where its results are."""

    status: int
    out: str
    err: str
    folder: Path

    @property
    def result(self) -> dict[str, Any]:
        result: dict[str, Any] = json.loads((self.folder / "result.json").read_text())
        return result

    def found(self, severity: str) -> list[dict[str, Any]]:
        """The findings of one severity."""
        return [finding for finding in self.result["findings"] if finding["severity"] == severity]

    def part(self, name: str) -> dict[str, Any]:
        """The row of one part."""
        return next(part for part in self.result["parts"] if part["name"] == name)


def command(folder: Path, *arguments: str) -> Done:
    """Run the command line in a folder and an interpreter of its own."""
    done = subprocess.run(
        [*COMMAND, *arguments], cwd=folder, env=ENVIRONMENT, capture_output=True, text=True, timeout=900
    )
    return Done(done.returncode, done.stdout, done.stderr, results_of(folder, arguments))


def command_here(folder: Path, *arguments: str) -> Done:
    """The same in this interpreter, which is quicker: what has been compiled stays so."""
    from flowemu.cli import main

    out, err = io.StringIO(), io.StringIO()
    with contextlib.chdir(folder), contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        status = main(arguments)
    return Done(status, out.getvalue(), err.getvalue(), results_of(folder, arguments))


def results_of(folder: Path, arguments: tuple[str, ...]) -> Path:
    """Where a command puts its results unless it is told otherwise."""
    return folder / "outputs" / next((Path(text).stem for text in arguments if text.endswith(".yaml")), "")


@pytest.fixture(scope="session")
def ran(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Done]:
    """`ran("comb")`: the run of flows/comb.yaml with its own settings, made once."""

    @cache
    def run(name: str) -> Done:
        done = command(tmp_path_factory.mktemp(name), "run", str(ROOT / "flows" / f"{name}.yaml"))
        assert done.status in (0, 1), done.err
        return done

    return run


@pytest.fixture
def die(tmp_path: Path) -> Path:
    """A project folder with a small flow, one cell wide, and its layout."""
    (tmp_path / "pyproject.toml").write_text("")
    draw_layouts(tmp_path)
    shutil.copy(HERE / "small.yaml", tmp_path)
    return tmp_path
