"""The recipes of DEVELOPERS.md work as they stand there."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import pytest

from flowemu import registry
from flowemu.errors import InputError, StepError
from flowemu.flow.load import load_flow
from tests.contracts import test_kinds

ROOT = Path(__file__).parents[2]
FENCE = re.compile(r"```python\n# (\S+)\n(.*?)```", re.DOTALL)
FLOW = """
flow: Recipe
layout: {file: die.gds, masks: {HOLE: 10/0}}
grid: {cell: 0.5 um}
steps:
  - clean: {with: sulfuric peroxide, time: 10 min}
  - deposit: {film: glass, material: psg, thickness: 1 um, method: lpcvd, coverage: 60 %}
  - release: {with: hf 49, time: 2 min, dry: air}
"""


def written(path: str) -> ModuleType:
    """The module that the page shows under this path."""
    code = dict(FENCE.findall((ROOT / "DEVELOPERS.md").read_text()))[path]
    name = path.removesuffix(".py").replace("/", ".")
    module = ModuleType(name)
    module.__file__ = path
    sys.modules[name] = module
    exec(compile(code, path, "exec"), module.__dict__)
    return module


@pytest.fixture
def recipes(monkeypatch: pytest.MonkeyPatch) -> Iterator[tuple[ModuleType, ModuleType]]:
    """Both examples in place beside the kinds that there are."""
    step, check = written("flowemu/steps/clean.py"), written("flowemu/checks/air_dried.py")
    found = registry.modules
    beside = {"flowemu.steps": step, "flowemu.checks": check}
    monkeypatch.setattr(registry, "modules", lambda package: [*found(package), beside[package]])
    forget()
    yield step, check
    monkeypatch.undo()
    for module in (step, check):
        del sys.modules[module.__name__]
    forget()


def forget() -> None:
    """Make the registry look again."""
    registry.step_kinds.cache_clear()
    registry.checks.cache_clear()


def test_the_step_kind_keeps_every_promise(recipes: tuple[ModuleType, ModuleType]) -> None:
    kind = registry.step_kinds()["clean"]
    test_kinds.test_settings_are_a_frozen_model_with_a_name_and_a_note(kind)
    test_kinds.test_the_documentation_speaks_of_every_setting_and_shows_an_example(kind)
    test_kinds.test_the_examples_in_the_documentation_read(kind)
    test_kinds.test_every_setting_is_described_and_every_number_has_a_unit(kind)
    test_kinds.test_the_two_functions_take_what_the_engine_gives(kind)
    test_kinds.test_a_check_names_its_codes_and_explains_itself(registry.checks()["air dried"])


def test_a_flow_may_use_the_step_and_the_check_speaks(
    recipes: tuple[ModuleType, ModuleType], tmp_path: Path
) -> None:
    (tmp_path / "die.gds").touch()
    (tmp_path / "flow.yaml").write_text(FLOW)
    flow = load_flow(str(tmp_path / "flow.yaml"), ())
    assert (flow.steps[0].verb, flow.steps[0].settings.time) == ("clean", 600.0)
    view = type("View", (), {"flow": flow})
    (finding,) = registry.checks()["air dried"].run(view)
    assert (finding.code, finding.severity, finding.step) == ("air-dried", "warning", 3)


def test_the_step_refuses_resist(recipes: tuple[ModuleType, ModuleType]) -> None:
    class Stack:
        """A stack with one film, resist."""

        def index(self, name: str) -> int | None:
            return 0 if name == "resist" else None

    step, _ = recipes
    with pytest.raises(StepError, match="strip it first"):
        step.apply(type("State", (), {"stack": Stack()}), None, None)


def test_without_the_file_the_step_is_not_built(tmp_path: Path) -> None:
    (tmp_path / "die.gds").touch()
    (tmp_path / "flow.yaml").write_text(FLOW)
    with pytest.raises(InputError, match="clean"):
        load_flow(str(tmp_path / "flow.yaml"), ())
