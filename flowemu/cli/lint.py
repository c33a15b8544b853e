"""`flowemu lint`: everything that can be known without geometry."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from flowemu.cli._options import FLOW, allow_option, fail_on_option

if TYPE_CHECKING:
    from flowemu.findings import Finding
    from flowemu.flow.flow import Flow
    from flowemu.layout import Layout

BEFORE_GEOMETRY = ("flow", "layout")


@dataclass(frozen=True)
class LintView:
    """What a check that needs no geometry may look at."""

    flow: Flow
    layout: Layout


@click.command(short_help="Check flows without running them.")
@click.argument("flows", metavar="FLOW...", nargs=-1, required=True, type=FLOW)
@allow_option
@fail_on_option
def command(flows: tuple[str, ...], allow: tuple[str, ...], fail_on: str) -> int:
    """Check flows without running them: the file, the layout, the order of the steps."""
    from flowemu.errors import Fault, InputError
    from flowemu.findings import at_or_above

    faults: list[Fault] = []
    failed = False
    for path in flows:
        try:
            flow, findings = lint(path, allow)
        except InputError as error:
            faults += error.faults
            continue
        failed = failed or bool(at_or_above(findings, fail_on))
        _print(path, flow, findings)
    if faults:
        raise InputError(faults)
    return 1 if failed else 0


def lint(path: str, allow: tuple[str, ...]) -> tuple[Flow, list[Finding]]:
    """The flow, and what the checks that need no geometry find in it; the worst first."""
    from flowemu.cli._ahead import layout_ahead
    from flowemu.findings import worst_first
    from flowemu.flow.load import flow_of, read_flow_file

    document = read_flow_file(path)
    with layout_ahead(document.data, Path(path), allow) as reader:
        flow = flow_of(document, path, allow)
        return flow, worst_first(_found(flow, reader))


def _found(flow: Flow, reader: Callable[..., Any]) -> list[Finding]:
    from flowemu.flow.drawn import read_drawn
    from flowemu.flow.waivers import waived
    from flowemu.layout import MissingCell
    from flowemu.registry import checks

    view = LintView(flow, read_drawn(flow, reader, MissingCell, wanted=()))
    found = [f for check in checks().values() if check.needs in BEFORE_GEOMETRY for f in check.run(view)]
    return waived(found, flow.accept)


def _print(path: str, flow: Flow, findings: list[Finding]) -> None:
    found = f"{len(findings)} found" if findings else "nothing found"
    click.echo(f"{path}: {len(flow.steps)} steps, {len(flow.masks)} masks: {found}")
    for finding in findings:
        where = f" step {finding.step}" if finding.step is not None else ""
        mark = " (waived)" if finding.waived else ""
        click.echo(f"  {finding.severity}{mark} {finding.code}{where}: {finding.text} {finding.cause}".rstrip())
