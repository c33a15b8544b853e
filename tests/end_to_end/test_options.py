"""What the commands' options do, on a flow that is quick."""

from __future__ import annotations

import json
import os
import pty
import re
import shutil
import signal
import subprocess
from pathlib import Path

import pytest

from tests.end_to_end.conftest import COMMAND, ENVIRONMENT, ROOT, command_here


def test_probe_prints_one_line_of_json_a_point(die: Path) -> None:
    done = command_here(die, "probe", "small.yaml", "--at", "0,0.25", "--at", "0.008 mm,250nm", "--json")
    assert done.status == 0, done.err
    anchor, beside = (json.loads(line) for line in done.out.splitlines())
    assert list(anchor) == ["at_um", "stack"]
    assert beside["at_um"] == [8.0, 0.25]
    for point in (anchor, beside):
        assert all(list(entry) == ["film", "material", "from_um", "to_um"] for entry in point["stack"])
        heights = [height for entry in point["stack"] for height in (entry["from_um"], entry["to_um"])]
        assert heights == sorted(heights), "the lowest first"
        assert point["stack"][0] == {"film": "wafer", "material": "silicon", "from_um": -525.0, "to_um": 0.0}
    assert [entry["film"] for entry in anchor["stack"]] == ["wafer", "base", "beam"]
    assert [entry["film"] for entry in beside["stack"]] == ["wafer", "base", "glass", "beam"]
    assert beside["stack"][2]["to_um"] - beside["stack"][2]["from_um"] == pytest.approx(1.0, abs=0.005)
    assert not (die / "outputs").exists()


def test_probe_prints_a_table_for_people(die: Path) -> None:
    done = command_here(die, "probe", "small.yaml", "--at", "8,0.25", "--after", "base")
    assert done.status == 0, done.err
    assert [line.split()[0] for line in done.out.splitlines()[1:3]] == ["base", "wafer"]
    assert "0.2 um" in done.out


def test_until_stops_after_a_step_and_fail_on_lowers_the_bar(die: Path) -> None:
    done = command_here(die, "run", "small.yaml", "--until", "open")
    assert done.status == 0, done.err
    assert [step["index"] for step in done.result["steps"]] == [1, 2, 3, 4]
    (warning,) = done.found("warning")
    assert (warning["code"], warning["film"], warning["step"]) == ("film-attacked", "base", 4)
    assert "READY: 0 errors, 1 warning" in done.out
    strict = command_here(die, "run", "small.yaml", "--until", "4", "--fail-on", "warning")
    assert strict.status == 1
    assert "NOT READY: 0 errors, 1 warning" in strict.out


def test_until_nothing_is_the_bare_wafer(die: Path) -> None:
    done = command_here(die, "run", "small.yaml", "--until", "0", "--out", "bare")
    assert done.status == 0, done.err
    result = json.loads((die / "bare" / "result.json").read_text())
    assert result["steps"] == []
    assert [film["name"] for film in result["films"]] == ["wafer"]


def test_cell_stands_in_for_the_flows_own(die: Path) -> None:
    done = command_here(die, "run", "small.yaml", "--until", "1", "--cell", "250nm")
    assert done.result["grid"]["cell_um"] == 0.25
    assert done.result["grid"]["shape_zyx"][1:] == [2, 80]


def test_section_draws_after_each_step_asked_for(die: Path) -> None:
    line = ("--line=-10,0.25,10,0.25", "--after", "base", "--after", "4")
    done = command_here(die, "section", "small.yaml", *line)
    assert done.status == 0, done.err
    files = [Path(name) for name in done.out.splitlines()]
    assert sorted({file.name.split("_")[0] for file in files}) == ["step01", "step04"]
    assert sorted(file.suffix for file in files) == sorted([".pdf", ".png", ".svg"] * 2)
    assert all((die / file).is_file() for file in files)


def test_mesh_writes_the_formats_asked_for_and_the_same_bytes_again(die: Path) -> None:
    first = command_here(die, "mesh", "small.yaml", "--format", "stl", "--after", "2")
    assert first.status == 0, first.err
    files = [die / name for name in first.out.splitlines()]
    assert sorted(file.name.rpartition("-")[2] for file in files) == ["base.stl", "glass.stl", "wafer.stl"]
    before = [file.read_bytes() for file in files]
    command_here(die, "mesh", "small.yaml", "--format", "stl", "--after", "2")
    assert [file.read_bytes() for file in files] == before


def test_a_second_run_replaces_what_the_first_one_left(die: Path) -> None:
    command_here(die, "run", "small.yaml")
    done = command_here(die, "run", "small.yaml", "--until", "1")
    assert {file.name.split("_")[0] for file in (done.folder / "figures").iterdir()} == {"step01"}


def test_ctrl_c_stops_with_130_and_leaves_nothing_behind(tmp_path: Path) -> None:
    run = [*COMMAND, "run", str(ROOT / "flows" / "rotor.yaml")]
    pipes = {"stdout": subprocess.DEVNULL, "stderr": subprocess.PIPE}
    with subprocess.Popen(run, cwd=tmp_path, env=ENVIRONMENT, text=True, **pipes) as process:
        assert re.match(r"\d+/19 step", process.stderr.readline())
        process.send_signal(signal.SIGINT)
        told = process.stderr.read()
    assert process.returncode == 130
    assert told.splitlines()[-1] == "flowemu: stopped"
    assert "Traceback" not in told
    assert list(tmp_path.iterdir()) == []


def test_a_terminal_gets_a_bar_and_a_pipe_gets_lines(die: Path) -> None:
    ours, theirs = pty.openpty()
    arguments = [*COMMAND, "probe", "small.yaml", "--at", "0,0.25"]
    environment = {**ENVIRONMENT, "TERM": "xterm"}
    with subprocess.Popen(arguments, cwd=die, env=environment, stdout=subprocess.DEVNULL, stderr=theirs) as shown:
        os.close(theirs)
        told = b""
        try:
            while piece := os.read(ours, 4096):
                told += piece
        except OSError:  # how a closed terminal ends on Linux
            pass
    os.close(ours)
    assert shown.returncode == 0
    assert b"\x1b[" in told
    assert b"step 6 (deposit)" in told or b"checks" in told
    piped = command_here(die, "probe", "small.yaml", "--at", "0,0.25")
    assert "\x1b" not in piped.err


def test_a_plate_that_stands_on_nitride_is_free_once_the_glass_is_gone(die: Path) -> None:
    """By hand: 16 um of annealed psg at 3.6 um/min from the plate's edge to its anchor, 267 s, and a fifth more.

    The nitride below the anchor goes at 5 nm/min and does not count; glass lines the anchor's hole on neither side.
    """
    done = command_here(die, "run", str(shutil.copy(ROOT / "tests" / "end_to_end" / "anchored.yaml", die)))
    assert done.status == 0, done.out
    assert done.part("plate")["state"] == "held"
    release = done.result["steps"][-1]
    assert release["seconds"] == pytest.approx(1.2 * 16.0 / 3.6 * 60.0, rel=0.05)
    assert "expected 2 of 2 hold" in done.out
