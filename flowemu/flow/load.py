"""Reads a flow file: text -> document -> sections and steps -> a checked flow, with every fault collected."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from flowemu.errors import Fault, InputError, hint, near_miss
from flowemu.flow.complaints import empty_values, faults_of
from flowemu.flow.document import Document
from flowemu.flow.document import Path as EntryPath
from flowemu.flow.flow import Flow, Step
from flowemu.flow.paths import named_file
from flowemu.flow.quantities import shape
from flowemu.flow.reader import read_document
from flowemu.flow.sections import FlowFile
from flowemu.registry import VERBS, StepKind, step_kinds


def load_flow(path: Path | str, allow: Iterable[Path | str] = ()) -> Flow:
    """The flow in a file.

    Parameters
    ----------
    path : path
        The flow file; complaints name it as given.
    allow : iterable of paths
        Folders beside the project's own from which the flow may read.

    Raises
    ------
    InputError
        With every fault found in the file, each with its line and column.
    """
    return flow_of(read_flow_file(path), path, allow)


def read_flow_file(path: Path | str) -> Document:
    """The flow file as plain data with places, not yet checked."""
    try:
        raw = Path(path).read_bytes()
    except OSError as error:
        reason = (error.strerror or "cannot be read").lower()
        raise InputError([Fault(str(path), None, None, f"the flow file cannot be read: {reason}")]) from None
    except ValueError:
        raise InputError([Fault(None, None, None, f"{str(path)!r} is not the name of a file")]) from None
    return read_document(raw, str(path))


def flow_of(document: Document, path: Path | str, allow: Iterable[Path | str] = ()) -> Flow:
    """The flow in a document that stands at `path`; see `load_flow`."""
    from flowemu.flow.order import order_faults
    from flowemu.flow.trade import trade_faults

    steps, faults = _steps(document)
    complete = not faults
    faults += empty_values(document, _bare_verbs(document))
    limits, limit_faults = _limits(document)
    faults += limit_faults
    try:
        file = FlowFile.model_validate(document.data)
    except ValidationError as error:
        raise InputError([*faults, *faults_of(error, document, FlowFile)]) from None
    layout_path, path_faults = _layout(document, file, Path(path), allow)
    faults += path_faults
    flow = Flow(Path(path), layout_path, document, file, tuple(steps), limits)
    faults += order_faults(flow, complete)
    faults += trade_faults(flow, complete)
    if faults:
        raise InputError(faults)
    return flow


def _layout(document: Document, file: FlowFile, path: Path, allow: Iterable[Path | str]) -> tuple[Path, list[Fault]]:
    try:
        return named_file(path, file.layout.file, [Path(folder) for folder in allow]), []
    except (OSError, ValueError) as error:
        return Path(file.layout.file), [document.fault(("layout", "file"), f"layout.file: {error}")]


def _limits(document: Document) -> tuple[Any, list[Fault]]:
    """The limits, whose many models are built only where a flow has some."""
    given = document.data.get("limits")
    if not isinstance(given, dict):
        return None, []
    from flowemu.flow.limits import Limits

    try:
        return Limits.model_validate(given), []
    except ValidationError as error:
        return None, list(faults_of(error, document, Limits, ("limits",), "limits"))


def _steps(document: Document) -> tuple[list[Step], list[Fault]]:
    """The steps that read well, and the faults of the others."""
    raw = document.data.get("steps")
    steps: list[Step] = []
    faults: list[Fault] = []
    for index, entry in enumerate(raw if isinstance(raw, list) else []):
        try:
            steps.append(_step(document, index, entry))
        except InputError as error:
            faults += error.faults
    return steps, faults


def _step(document: Document, index: int, entry: Any) -> Step:
    label = f"step {index + 1}"
    verb = _verb(document, index, entry)
    kind = step_kinds().get(verb)
    where: EntryPath = ("steps", index, verb)
    if kind is None:
        text = f"step kind '{verb}' is not built yet" if verb in VERBS else _unknown_verb(verb)
        raise InputError([document.fault(where, f"{label}: {text}", at_key=True)])
    given = _settings(kind, entry[verb] if isinstance(entry, dict) else None)
    label = f"{label} ({verb})"
    if not isinstance(given, dict):
        text = f"{label}: expected a mapping of settings, found {shape(given)}"
        raise InputError([document.fault(where, text)])
    try:
        return Step(index + 1, verb, kind.settings.model_validate(given), where)
    except ValidationError as error:
        faults = [*faults_of(error, document, kind.settings, where, label)]
        faults += _rules(document, kind, given, where, label)
        raise InputError(faults) from None


def _unknown_verb(verb: str) -> str:
    return f"unknown step '{verb}'{hint(verb, VERBS, 'the steps are')}"


def _rules(document: Document, kind: StepKind, given: dict[str, Any], where: EntryPath, label: str) -> Iterator[Fault]:
    """The rules between settings, which the model itself looks at only when each setting is good."""
    known = kind.settings.names()
    broken = kind.settings.broken_rules(name if name in known else near_miss(name, known) for name in given)
    if broken:
        yield document.fault(where, f"{label}: {'; '.join(broken)}", at_key=True)


def _settings(kind: StepKind, given: Any) -> Any:
    """The settings of a step as a mapping, its short form written out."""
    if given is None:
        return {}
    if kind.short is not None and isinstance(given, str):
        return {kind.short: given}
    return given


def _verb(document: Document, index: int, entry: Any) -> str:
    """The one verb of a step."""
    where = ("steps", index)
    if isinstance(entry, str):
        return entry
    if not isinstance(entry, dict) or not entry:
        text = f"step {index + 1}: expected a verb with its settings, found {shape(entry)}"
        raise InputError([document.fault(where, text)])
    if len(entry) > 1:
        text = f"a step is one verb with its settings indented under it; found {', '.join(map(str, entry))}"
        raise InputError([document.fault(where, f"step {index + 1}: {text}")])
    return str(next(iter(entry)))


def _bare_verbs(document: Document) -> set[EntryPath]:
    """The steps without settings, such as `- inspect:`; their empty value is no fault."""
    raw = document.data.get("steps")
    steps = raw if isinstance(raw, list) else []
    return {("steps", i, *entry) for i, entry in enumerate(steps) if isinstance(entry, dict) and len(entry) == 1}
