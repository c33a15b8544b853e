"""What a check reports: one finding per code, step, film and part."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

SEVERITIES = ("error", "warning", "note")


@dataclass(frozen=True)
class Finding:
    """One thing found, with its place and its cause.

    Attributes
    ----------
    code : str
        Hyphenated trade words, such as `missing-anchor`.
    severity : str
        `error`, `warning` or `note`.
    step : int or None
        Number of the step, from 1.
    film, part : str or None
        What it is about.
    at_um : (x, y, z) or None
        The worst place, um; a z that does not apply is left out by giving None for the place.
    text, cause : str
        What is wrong, and why, as sentences for an engineer.
    size_um : float or None
        How large it is, by which findings of one severity are ordered.
    waived : bool
        Accepted by the flow's `accept:` section: shown and counted, but without effect on the verdict.
    """

    code: str
    severity: str
    step: int | None
    film: str | None
    part: str | None
    at_um: tuple[float, ...] | None
    text: str
    cause: str
    size_um: float | None = None
    waived: bool = False

    def __post_init__(self) -> None:
        if self.severity not in SEVERITIES:
            raise ValueError(f"severity {self.severity!r} is none of {', '.join(SEVERITIES)}")

    def waive(self) -> Finding:
        """The same finding, accepted."""
        return replace(self, waived=True)


def _rank(finding: Finding) -> tuple[bool, int, float, int, str]:
    size = finding.size_um if finding.size_um is not None else 0.0
    return finding.waived, SEVERITIES.index(finding.severity), -size, finding.step or 0, finding.code


def worst_first(findings: Iterable[Finding]) -> list[Finding]:
    """Unwaived before waived, errors before warnings before notes, large before small."""
    return sorted(findings, key=_rank)


def at_or_above(findings: Iterable[Finding], severity: str) -> list[Finding]:
    """The unwaived findings that are as bad as `severity` or worse."""
    limit = SEVERITIES.index(severity)
    return [f for f in findings if not f.waived and SEVERITIES.index(f.severity) <= limit]
