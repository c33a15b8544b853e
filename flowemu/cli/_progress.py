"""Progress by step: a bar on a terminal, plain lines where the output is piped."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

import click

Report = Callable[[int, int, str], None]
"""Called as `report(done, total, text)`: so many of the steps are done, and what comes next."""
QUIET_S = 1.0  # what is over sooner needs no progress


@contextmanager
def progress() -> Iterator[Report]:
    """A callback that shows how far a run is, on standard error."""
    if sys.stderr.isatty():
        with _bar() as report:
            yield report
    else:
        yield _lines(time.monotonic())


def _lines(began: float) -> Report:
    """Plain lines, once the work has taken long enough."""

    def report(done: int, total: int, text: str) -> None:
        if time.monotonic() - began > QUIET_S:
            click.echo(f"{done}/{total} {text}", err=True)

    return report


@contextmanager
def _bar() -> Iterator[Report]:
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeElapsedColumn

    columns = (BarColumn(), MofNCompleteColumn(), TimeElapsedColumn(), TextColumn("{task.description}"))
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("", total=None)
        yield lambda done, total, text: bar.update(task, completed=done, total=total, description=text)
