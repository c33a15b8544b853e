"""What a check may look at, and the run of all checks."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any, TypeVar

from flowemu.engine.expected import Outcome, outcomes
from flowemu.findings import Finding, worst_first
from flowemu.flow.flow import Flow
from flowemu.flow.waivers import waived
from flowemu.layout import Layout
from flowemu.registry import checks
from flowemu.stack.wafer import Wafer

E = TypeVar("E")
EXPECTATION = "expectation-failed"


@dataclass(frozen=True, eq=False)
class View:
    """A wafer after a step, for the checks.

    Attributes
    ----------
    step : the last step carried out
    ended : whether that is the flow's last one
    parts : rows of the parts, see `record.PartRow`
    """

    flow: Flow
    layout: Layout
    tools: Any
    wafer: Wafer
    step: int
    ended: bool = False
    parts: tuple[Any, ...] = field(default=())

    def events(self, kind: type[E]) -> list[E]:
        """Events of one kind, in order."""
        return [event for event in self.wafer.events if isinstance(event, kind)]

    def step_title(self, index: int) -> str:
        """`step 9 (etch, oxide rie)`."""
        step = self.flow.steps[index - 1]
        agent = getattr(step.settings, "etchant", None)
        return f"step {index} ({step.verb}, {agent})" if agent else step.title

    @cached_property
    def outcomes(self) -> list[Outcome]:
        """Every expectation and how it came out."""
        return outcomes(self.flow, self.wafer, self.parts)

    def expectations(self) -> tuple[int, int]:
        """How many expectations hold, and how many there are."""
        return sum(outcome.holds for outcome in self.outcomes), len(self.outcomes)

    def limit(self, key: str, severity: str, default: Any) -> Any:
        """The flow's own limit where it states one, else the default; see `Flow.limit`."""
        own = self.flow.limit(key, severity)
        return default if own is None else own


def judge_flow(view: View) -> list[Finding]:
    """All findings on a structure, the worst first, with the flow's waivers applied."""
    found = [finding for check in checks().values() for finding in check.run(view)]
    unique = {(f.code, f.step, f.film, f.part): f for f in reversed(_explained(found))}
    return worst_first(waived(unique.values(), view.flow.accept))


def _explained(found: list[Finding]) -> list[Finding]:
    """A failed expectation about a part that has an error of its own follows from that one: it becomes a note."""
    broken = {f.part: f.code for f in found if f.severity == "error" and f.part and f.code != EXPECTATION}
    return [
        replace(f, severity="note", cause=f"{f.cause} This follows from {broken[f.part]}.".strip())
        if f.code == EXPECTATION and f.part in broken
        else f
        for f in found
    ]
