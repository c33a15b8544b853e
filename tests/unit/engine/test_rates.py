"""Which rates decided a run although the flow states them itself or no source backs them."""

from __future__ import annotations

from flowemu.engine.rates import deciding_rates
from flowemu.engine.tools import Tools
from flowemu.flow.flow import Flow
from flowemu.flow.process import load_process_data
from flowemu.stack.wafer import Cut, Loss, Wafer
from tests import stacks
from tests.unit.engine.runs import HEAD, finished, flow_from, of_steps


def decided(flow: Flow, *events: Cut) -> tuple[tuple[str, ...], tuple[str, ...]]:
    tools = Tools(flow, load_process_data(flow.data or None), None, {})  # type: ignore[arg-type]
    return deciding_rates(flow, tools, Wafer(stacks.bare(stacks.even_grid(4, -2, 2)), events=events))


def took(step: int, agent: str, film: str, material: str, verb: str = "etch") -> Cut:
    return Cut(step, verb, agent, 60.0, None, (Loss(film, material, 1.0, 1.0, 1.0, 1.0, True, False),))


GLASS = "deposit: {film: glass, material: psg, thickness: 2 um, method: lpcvd, coverage: 60 %}"
OXIDE = "deposit: {film: oxide, material: thermal oxide, thickness: 2 um, method: lpcvd, coverage: 60 %}"


def test_a_rate_of_the_step_itself_is_overridden_by_film_or_material() -> None:
    for name in ("glass", "psg"):
        flow = of_steps(GLASS, f"etch: {{with: hf 10:1, time: 1 min, rates: {{{name}: 1 um/min}}}}")
        assert decided(flow, took(2, "hf 10:1", "glass", "psg")) == (("psg in hf 10:1",), ())


def test_a_rate_of_the_flows_own_data_is_overridden() -> None:
    flow = flow_from(
        HEAD + f"  - {GLASS}\n  - etch: {{with: hf 10:1, time: 1 min}}\n"
        "data:\n  rates:\n    hf 10:1:\n      - {material: psg, rate: 900 nm/min, source: our log}\n"
    )  # fmt: skip
    assert decided(flow, took(2, "hf 10:1", "glass", "psg")) == (("psg in hf 10:1",), ())


def test_a_datum_from_memory_is_told_and_one_that_was_read_is_not() -> None:
    """In the built-in data psg in hf 10:1 stands from memory and thermal oxide in it was read."""
    flow = of_steps(GLASS, OXIDE, "etch: {with: hf 10:1, time: 1 min}")
    assert decided(flow, took(3, "hf 10:1", "glass", "psg")) == ((), ("psg in hf 10:1",))
    assert decided(flow, took(3, "hf 10:1", "oxide", "thermal oxide")) == ((), ())


def test_only_what_lost_something_to_an_etch_counts_and_once() -> None:
    flow = of_steps(GLASS, "etch: {with: hf 10:1, time: 1 min}", "strip: glass")
    assert decided(flow) == ((), ())
    assert decided(flow, took(3, "bath", "glass", "psg", verb="strip")) == ((), ())
    twice = took(2, "hf 10:1", "glass", "psg"), took(2, "hf 10:1", "glass", "psg")
    assert decided(flow, *twice) == ((), ("psg in hf 10:1",))


def test_a_run_tells_them() -> None:
    """The release takes psg at the data's rate, which is from memory; 2 nm/min of the step's own took none of it."""
    assert "psg in hf 10:1" in finished().record.from_memory
    assert "psg in hf 10:1" not in finished().record.overridden
