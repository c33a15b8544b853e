"""Every step kind and every check keeps the promises of its kind, today's and tomorrow's."""

from __future__ import annotations

import inspect
import re
from types import ModuleType

import pytest

from flowemu import registry
from flowemu.flow.quantities import quantity_in
from flowemu.flow.settings import Settings, StepSettings
from flowemu.registry import Check, RegistryError, StepKind, checks, finding_codes, step_kinds

STEPS = list(step_kinds().values())
CHECKS = list(checks().values())


def by_verb(kind: StepKind) -> str:
    return kind.verb


@pytest.mark.parametrize("kind", STEPS, ids=by_verb)
def test_settings_are_a_frozen_model_with_a_name_and_a_note(kind: StepKind) -> None:
    assert issubclass(kind.settings, StepSettings)
    assert kind.settings.model_config.get("extra") == "forbid"
    assert kind.settings.model_config.get("frozen") is True
    assert {"name", "note"} <= set(kind.settings.names())


@pytest.mark.parametrize("kind", STEPS, ids=by_verb)
def test_the_documentation_speaks_of_every_setting_and_shows_an_example(kind: StepKind) -> None:
    for name in kind.settings.names():
        assert re.search(rf"(^|[\s,]){re.escape(name)}[,\s].*:|^{re.escape(name)} :", kind.doc, re.MULTILINE), name
    assert re.search(rf"^    - {re.escape(kind.verb)}:", kind.doc, re.MULTILINE)
    for heading in ("What it models.", "What it refuses."):
        assert heading in kind.doc


@pytest.mark.parametrize("kind", STEPS, ids=by_verb)
def test_the_examples_in_the_documentation_read(kind: StepKind) -> None:
    from flowemu.flow.reader import read_document

    examples = re.findall(rf"^    - {re.escape(kind.verb)}:.*$", kind.doc, re.MULTILINE)
    for example in examples:
        given = read_document(f"steps:\n{example}\n".encode(), "doc").data["steps"][0][kind.verb]
        if isinstance(given, str):
            assert kind.short is not None
            given = {kind.short: given}
        kind.settings.model_validate(given or {})


@pytest.mark.parametrize("kind", STEPS, ids=by_verb)
def test_every_setting_is_described_and_every_number_has_a_unit(kind: StepKind) -> None:
    for name, field in kind.settings.model_fields.items():
        assert field.description, name
        if "float" in str(field.annotation) and "tuple" not in str(field.annotation) and "dict" not in str(field):
            assert quantity_in(field) is not None, f"{name} takes a number without a unit"


@pytest.mark.parametrize("kind", STEPS, ids=by_verb)
def test_rules_speak_of_settings_that_there_are(kind: StepKind) -> None:
    settings: type[Settings] = kind.settings
    named = [*(n for group in settings.exactly_one for n in group), *settings.only_with]
    named += [other for others in settings.only_with.values() for other in others]
    assert set(named) <= set(settings.names())
    assert kind.short is None or kind.short in settings.names()


@pytest.mark.parametrize("kind", STEPS, ids=by_verb)
def test_the_two_functions_take_what_the_engine_gives(kind: StepKind) -> None:
    assert list(inspect.signature(kind.apply).parameters) == ["state", "settings", "tools"]
    assert list(inspect.signature(kind.heights).parameters) == ["profile", "settings", "tools"]
    assert kind.version >= 1


@pytest.mark.parametrize("check", CHECKS, ids=lambda c: c.name)
def test_a_check_names_its_codes_and_explains_itself(check: Check) -> None:
    assert check.codes
    assert all(re.fullmatch(r"[a-z]+(-[a-z]+)*", code) for code in check.codes)
    assert all(finding_codes()[code] is check for code in check.codes), "a code belongs to one check"
    assert len(check.doc.split()) > 10
    assert len(inspect.signature(check.run).parameters) == 1


def module(name: str, **members: object) -> ModuleType:
    made = ModuleType(f"flowemu.steps.{name}", "Documentation.")
    made.__file__ = f"/somewhere/{name}.py"
    for key, value in members.items():
        setattr(made, key, value)
    return made


def nothing(state: object, settings: object, tools: object) -> None:
    """A step that does nothing."""


@pytest.mark.parametrize(
    ("bad", "says"),
    [
        (module("etch"), "/somewhere/etch.py: expected a StepKind named KIND"),
        (module("etch", KIND="etch"), "/somewhere/etch.py: expected a StepKind named KIND"),
        (module("etch", KIND=StepKind("strip", StepSettings, nothing, nothing)), "the verb 'strip' is not that of"),
        (module("melt", KIND=StepKind("melt", StepSettings, nothing, nothing)), "the verb 'melt' is not that of"),
    ],
)
def test_a_file_that_does_not_fit_stops_with_its_own_path(
    bad: ModuleType, says: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(registry, "modules", lambda package: [bad])
    with pytest.raises(RegistryError, match=re.escape(says)):
        step_kinds.__wrapped__()


def test_a_file_without_documentation_stops(monkeypatch: pytest.MonkeyPatch) -> None:
    bare = module("etch", KIND=StepKind("etch", StepSettings, nothing, nothing))
    bare.__doc__ = None
    monkeypatch.setattr(registry, "modules", lambda package: [bare])
    with pytest.raises(RegistryError, match="has no docstring"):
        step_kinds.__wrapped__()
