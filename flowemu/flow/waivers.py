"""Marks the findings that a flow's `accept:` section accepts."""

from __future__ import annotations

from collections.abc import Iterable

from flowemu.findings import Finding
from flowemu.flow.sections import Waiver


def waived(findings: Iterable[Finding], waivers: Iterable[Waiver]) -> list[Finding]:
    """The findings, those that a waiver covers marked as such; in their order."""
    accepted = tuple(waivers)
    return [finding.waive() if any(covers(w, finding) for w in accepted) else finding for finding in findings]


def covers(waiver: Waiver, finding: Finding) -> bool:
    """Whether the waiver is for this code on this part or film."""
    if waiver.code != finding.code:
        return False
    if waiver.part is not None:
        return waiver.part == finding.part
    return waiver.film == finding.film
