"""The repository keeps its word: every kind has a test and an example, and every flow is run."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from flowemu.flow.load import load_flow
from flowemu.registry import Check, StepKind, checks, finding_codes, step_kinds

ROOT = Path(__file__).parents[2]
FLOWS = sorted((ROOT / "flows").glob("*.yaml"))
TESTS = {path.relative_to(ROOT).as_posix(): path.read_text() for path in (ROOT / "tests").rglob("test_*.py")}
STEPS, CHECKS = list(step_kinds().values()), list(checks().values())


def module_of(check: Check) -> str:
    return check.run.__module__.rpartition(".")[2]


@pytest.mark.parametrize("kind", STEPS, ids=lambda kind: kind.verb)
def test_every_step_kind_has_unit_tests_that_carry_it_out_and_that_it_refuses_something(kind: StepKind) -> None:
    """`inspect` refuses nothing but unknown settings."""
    text = TESTS[f"tests/unit/steps/test_{kind.verb.replace('-', '_')}.py"]
    assert len(re.findall(r"^def test_", text, re.MULTILINE)) >= 2
    assert re.search(rf'"{kind.verb}"', text)
    assert "pytest.raises" in text


@pytest.mark.parametrize("kind", [k for k in STEPS if k.verb not in ("polish", "inspect")], ids=lambda kind: kind.verb)
def test_every_step_kind_is_used_in_a_flow_of_the_demonstration(kind: StepKind) -> None:
    """A polish and an inspection have no place on this die; their documentation shows them."""
    assert any(re.search(rf"^  - {kind.verb}:", path.read_text(), re.MULTILINE) for path in FLOWS)


@pytest.mark.parametrize("check", CHECKS, ids=lambda check: check.name)
def test_every_check_has_unit_tests_that_make_it_speak_and_that_leave_it_silent(check: Check) -> None:
    text = TESTS[f"tests/unit/checks/test_{module_of(check)}.py"]
    for code in check.codes:
        assert f'"{code}"' in text, f"no test makes it say {code}"
    assert "== []" in text


@pytest.mark.parametrize("code", sorted(finding_codes()))
def test_every_code_is_explained(code: str, capsys: pytest.CaptureFixture[str]) -> None:
    from flowemu.cli import main

    assert main(("explain", code)) == 0
    assert finding_codes()[code].doc.splitlines()[0] in capsys.readouterr().out


@pytest.mark.parametrize("path", FLOWS, ids=lambda path: path.stem)
def test_every_flow_reads_and_is_run_by_an_end_to_end_test(path: Path) -> None:
    flow = load_flow(str(path), ())
    assert flow.expect, "it says what it should come out as"
    used = [text for name, text in TESTS.items() if name.startswith("tests/end_to_end/")]
    assert any(f'ran("{path.stem}")' in text for text in used)


@pytest.mark.parametrize("name", [path.stem for path in FLOWS if "_" in path.stem])
def test_every_broken_twin_has_its_sound_one(name: str) -> None:
    assert (ROOT / "flows" / f"{name.split('_')[0]}.yaml").is_file()


@pytest.mark.parametrize("kind", [*STEPS, *CHECKS], ids=lambda kind: getattr(kind, "verb", None) or kind.name)
def test_it_says_what_it_rests_on(kind: StepKind | Check) -> None:
    """A publication, or that it is common practice."""
    assert kind.sources
    assert all(len(source) > 20 for source in kind.sources)
