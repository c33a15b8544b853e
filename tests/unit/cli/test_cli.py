"""The command line: exit statuses, one line for every fault, and nothing heavy before it is needed."""

from __future__ import annotations

import contextlib
import json
import subprocess
import sys
from pathlib import Path

import click
import pytest

from flowemu import cli
from flowemu.cli import Commands, main
from flowemu.cli._options import CellSize, Lengths
from tests.messages.cases import FOLDER, draw_layouts

ROOT = Path(__file__).parents[3]
NOT_BEFORE_GEOMETRY = ("numba", "scipy", "pyvista", "trimesh", "matplotlib", "gdstk", "vtkmodules")
COMMANDS = ("explain", "lint", "mesh", "probe", "run", "schema", "section")


def loaded_by(folder: Path, *arguments: str) -> set[str]:
    """The modules that a command has loaded at its end, in an interpreter of its own."""
    code = (
        "import sys\nfrom flowemu.cli import main\n"
        f"status = main({list(arguments)!r})\n"
        "print('\\n' + ' '.join({name.split('.')[0] for name in sys.modules}))\nsys.exit(status)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        cwd=folder,
        env={"PYTHONPATH": str(ROOT), "PATH": ""},
        capture_output=True,
        text=True,
    )
    assert done.returncode == 0, done.stderr
    return set(done.stdout.splitlines()[-1].split())


@pytest.fixture
def die(tmp_path: Path) -> Path:
    """A project folder with a good flow and its layout."""
    (tmp_path / "pyproject.toml").write_text("")
    draw_layouts(tmp_path)
    (tmp_path / "good.yaml").write_text((FOLDER / "all_well" / "flow.yaml").read_text())
    (tmp_path / "bad.yaml").write_text((FOLDER / "unknown_step" / "flow.yaml").read_text())
    return tmp_path


def test_help_loads_nothing_heavy(tmp_path: Path) -> None:
    loaded = loaded_by(tmp_path, "--help")
    assert loaded.isdisjoint((*NOT_BEFORE_GEOMETRY, "numpy", "pydantic", "yaml"))


def test_lint_loads_nothing_heavy(die: Path) -> None:
    assert loaded_by(die, "lint", "good.yaml").isdisjoint(NOT_BEFORE_GEOMETRY)


def test_the_commands_are_found_by_looking() -> None:
    commands = Commands("flowemu")
    context = click.Context(commands)
    assert tuple(commands.list_commands(context)) == COMMANDS
    for name in COMMANDS:
        command = commands.get_command(context, name)
        assert command is not None
        assert command.get_short_help_str(80)
        assert not command.get_short_help_str(80).endswith("...")


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_explains_itself(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([command, "--help"]) == 0
    assert f"Usage: flowemu {command}" in capsys.readouterr().out


def test_lint_of_several_flows_tells_of_each(die: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with contextlib.chdir(die):
        assert main(["lint", "good.yaml", "bad.yaml", "none.yaml"]) == 2
    told = capsys.readouterr()
    assert told.out == "good.yaml: 4 steps, 1 masks: nothing found\n"
    assert [line.split(": ")[0] for line in told.err.splitlines()] == ["bad.yaml:12:5", "none.yaml"]


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (["lnt"], "there is no command 'lnt'; did you mean 'lint'?"),
        (["lint"], "flowemu: Missing argument 'FLOW...'. (see flowemu lint --help)"),
        (["run", "f.yaml", "--cell", "1e-30 um"], "'1e-30 um' is below 0.1 nm"),
        (["run", "f.yaml", "--cell", "0.5"], "'0.5' has no unit"),
        (["run", "f.yaml", "--fail-on", "all"], "'all' is not one of"),
        (["probe", "f.yaml", "--at", "3"], "expected 2 lengths"),
        (["explain", "thicknes"], "flowemu: nothing is named 'thicknes'; did you mean 'thickness'?"),
    ],
)
def test_wrong_use_is_status_2(arguments: list[str], says: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(arguments) == 2
    assert says in capsys.readouterr().err


def test_an_internal_fault_is_one_line(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    def broken(*args: object, **kwargs: object) -> None:
        raise RuntimeError("first\nsecond")

    monkeypatch.delenv(cli.DEBUG_SWITCH, raising=False)
    monkeypatch.setattr(cli.commands, "main", broken)
    assert main(["lint", "x"]) == 2
    expected = "flowemu: internal fault: RuntimeError: first second; set FLOWEMU_DEBUG=1 for the trace\n"
    assert capsys.readouterr().err == expected
    monkeypatch.setenv(cli.DEBUG_SWITCH, "1")
    with pytest.raises(RuntimeError):
        main(["lint", "x"])


def test_ctrl_c_is_status_130(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    def interrupted(*args: object, **kwargs: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(cli.commands, "main", interrupted)
    assert main(["lint", "x"]) == 130
    assert capsys.readouterr().err == "flowemu: stopped\n"


def test_schema_is_json(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["schema"]) == 0
    assert json.loads(capsys.readouterr().out)["title"] == "flowemu flow"


@pytest.mark.parametrize("word", ["etch", "thickness", "layout", "over", "expect"])
def test_explain_prints_the_docstring(word: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["explain", word]) == 0
    assert word in capsys.readouterr().out.splitlines()[0]


def test_explain_alone_lists_everything(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["explain"]) == 0
    told = capsys.readouterr().out
    assert "  etch         Removes material" in told
    assert "  layout       Where the masks come from." in told


def test_lengths_on_the_command_line_are_um_unless_they_say_otherwise() -> None:
    assert Lengths(2).convert("1,-2.5", None, None) == (1.0, -2.5)
    assert Lengths(2).convert("1 mm, 500 nm", None, None) == (1000.0, 0.5)
    assert CellSize().convert("0.5um", None, None) == 0.5
    with pytest.raises(click.BadParameter, match=r"is below 0\.1 nm"):
        CellSize().convert("0 um", None, None)


def test_the_module_is_the_command_line() -> None:
    done = subprocess.run([sys.executable, "-m", "flowemu", "--version"], cwd=ROOT, capture_output=True, text=True)
    assert (done.returncode, done.stdout) == (0, "flowemu, version 0.1.0\n")
