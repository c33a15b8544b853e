"""The end of a run on the terminal, in about twelve lines."""

from __future__ import annotations

from collections.abc import Sequence
from math import isfinite
from pathlib import Path

from flowemu.findings import SEVERITIES, Finding, at_or_above, worst_first
from flowemu.record import FreeRow, PartRow, RunRecord

LABEL = 9
MOST_ERRORS = 6
MOST_WARNINGS = 2
MOST_NAMES = 6
HASH = 8


def summary(record: RunRecord, folder: Path, fail_on: str = "error") -> list[str]:
    """Flow, grid, verdict, findings, parts, release, masks, expectations, rates, and what to do next.

    Parameters
    ----------
    folder : where the results are, as the user wrote it
    fail_on : the least severity that makes the flow not ready
    """
    lines = [flow_line(record), grid_line(record), verdict_line(record, fail_on)]
    lines += finding_lines(record.findings)
    lines += part_lines(record.parts)
    lines += window_lines(record)
    lines += free_lines(record.frees)
    if record.masks:
        lines.append(labelled("masks", few(list(record.masks))))
    held, all_of_them = record.expectations
    if all_of_them:
        lines.append(labelled("expected", f"{held} of {all_of_them} hold"))
    lines += rate_lines(record)
    lines.append(next_line(record, folder, fail_on))
    return lines


def labelled(label: str, text: str) -> str:
    """A line with its label in a column of its own."""
    return f"{label:<{LABEL}}{text}"


def flow_line(record: RunRecord) -> str:
    revision, masks = record.revision[:HASH], record.masks_sha256[:HASH]
    return labelled("flow", f"{record.flow}, revision {revision}, masks {masks}")


def grid_line(record: RunRecord) -> str:
    grid = record.grid
    x0, y0, x1, y1 = grid.box
    size = " x ".join(str(n) for n in reversed(grid.shape))
    said = "".join(f"; {note}" for note in record.notes)
    text = f"{x1 - x0:g} x {y1 - y0:g} um, cell {grid.cell:g} um, {size} = {grid.cells:,} cells"
    return labelled("window", text + said)


def verdict_line(record: RunRecord, fail_on: str) -> str:
    verdict = "NOT READY" if at_or_above(record.findings, fail_on) else "READY"
    open_ones = [finding for finding in record.findings if not finding.waived]
    counts = [plural(sum(f.severity == s for f in open_ones), s) for s in SEVERITIES]
    counts.append(f"{len(record.findings) - len(open_ones)} waived")
    return labelled(
        "verdict", f"{verdict}: {', '.join(counts)}; {plural(len(record.steps), 'step')} in {record.run_seconds:.0f} s"
    )


def plural(count: int, word: str) -> str:
    """`1 step`, `2 steps`."""
    return f"{count} {word}" if count == 1 else f"{count} {word}s"


def finding_lines(findings: Sequence[Finding]) -> list[str]:
    """The errors and the worst warnings, then how many more there are."""
    open_ones = [finding for finding in worst_first(findings) if not finding.waived]
    errors = [finding for finding in open_ones if finding.severity == "error"]
    warnings = [finding for finding in open_ones if finding.severity == "warning"]
    shown = errors[:MOST_ERRORS] + warnings[:MOST_WARNINGS]
    lines = [finding_line(finding) for finding in shown]
    left = len(errors) + len(warnings) - len(shown)
    if left:
        lines.append(labelled("", f"and {left} more in result.json"))
    return lines


def finding_line(finding: Finding) -> str:
    """Code, step, place, text and cause of one finding."""
    place = f" at ({', '.join(f'{v:.4g}' for v in finding.at_um)}) um" if finding.at_um else ""
    step = f", step {finding.step}" if finding.step is not None else ""
    said = " ".join(sentence.rstrip(" .") + "." for sentence in (finding.text, finding.cause) if sentence)
    return labelled(finding.severity, f"{finding.code}{step}{place}: {said}")


def part_lines(parts: Sequence[PartRow]) -> list[str]:
    """All parts by their state; the play of the loose ones."""
    if not parts:
        return []
    states: dict[str, list[str]] = {}
    for part in parts:
        states.setdefault(part.state, []).append(part.name + play_text(part))
    return [labelled("parts", "; ".join(f"{state}: {few(names)}" for state, names in states.items()))]


def play_text(part: PartRow) -> str:
    """A loose part's play along x, y, z in brackets."""
    if part.play_um is None:
        return ""
    pairs = zip("xyz", part.play_um[::2], part.play_um[1::2], strict=True)
    return " (play " + ", ".join(f"{axis} {reach('-', low)} {reach('+', high)}" for axis, low, high in pairs) + " um)"


def reach(sign: str, play: float) -> str:
    """How far a part can move one way, um; `open` where nothing stops it."""
    return f"{sign}{play:.3g}" if isfinite(play) else "open"


def few(names: Sequence[str]) -> str:
    """Names with commas between, and how many more there are."""
    more = len(names) - MOST_NAMES
    return ", ".join(names[:MOST_NAMES]) + (f" and {more} more" if more > 0 else "")


def window_lines(record: RunRecord) -> list[str]:
    """The etch window with the least share of time left before the first harm."""
    limited = [row for row in record.windows if row.limit_s and row.ends_s is not None]
    if not limited:
        return []
    tight = min(limited, key=lambda row: (row.limit_s or 0.0) / max(row.ends_s or 0.0, 1e-9))
    ends, limit = time_text(tight.ends_s or 0.0), time_text(tight.limit_s or 0.0)
    return [
        labelled("window", f"tightest in step {tight.step} ({tight.film}): ends {ends}, {tight.limited_by} {limit}")
    ]


def free_lines(frees: Sequence[FreeRow]) -> list[str]:
    """When the slowest part comes free against the planned time."""
    if not frees:
        return []
    slowest = max(frees, key=lambda row: float("inf") if row.free_s is None else row.free_s / max(row.planned_s, 1e-9))
    planned = time_text(slowest.planned_s)
    if slowest.free_s is None:
        return [labelled("release", f"{slowest.part} does not come free in the planned {planned}")]
    freed = f"{slowest.part} comes free after {time_text(slowest.free_s)} of the planned {planned}"
    return [labelled("release", freed + (f"; the last of {len(frees)} parts" if len(frees) > 1 else ""))]


def time_text(seconds: float) -> str:
    """A time in the unit that suits it."""
    if seconds < 120.0:
        return f"{seconds:.3g} s"
    return f"{seconds / 60.0:.3g} min" if seconds < 7200.0 else f"{seconds / 3600.0:.3g} h"


def rate_lines(record: RunRecord) -> list[str]:
    """Deciding rates that do not come from a source."""
    told = []
    if record.overridden:
        told.append(f"overridden in the flow: {few(record.overridden)}")
    if record.from_memory:
        told.append(f"from memory: {few(record.from_memory)}")
    return [labelled("rates", "; ".join(told))] if told else []


def next_line(record: RunRecord, folder: Path, fail_on: str) -> str:
    """What to do next, and where the results are."""
    blocking = worst_first(at_or_above(record.findings, fail_on))
    if not blocking:
        return labelled("next", f"look at the figures; results in {folder}")
    return labelled("next", f"flowemu explain {blocking[0].code}; results in {folder}")
