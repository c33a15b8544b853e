"""Finds the kinds: one step kind a module of `flowemu/steps`, one check a module of `flowemu/checks`.

There is no list to edit. A module that does not fit stops the program with its own path.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from functools import cache
from importlib import import_module
from pkgutil import iter_modules
from types import ModuleType
from typing import Any, TypeVar

from flowemu.errors import FlowemuError
from flowemu.findings import Finding

Kind = TypeVar("Kind", "StepKind", "Check")

NEEDS = ("flow", "layout", "geometry")
# The verbs that a flow file may use; those without a file in flowemu/steps are refused as not built yet.
VERBS = (
    "deposit", "oxidize", "pattern", "etch", "strip", "lift-off", "polish", "grind", "dope", "anneal", "bond", "flip",
    "release", "clean", "bake", "protect", "mount", "unmount", "dice", "inspect",
)  # fmt: skip


class RegistryError(FlowemuError):
    """A file in the folder of steps or checks does not define what it must."""


@dataclass(frozen=True)
class StepKind:
    """One verb of the flow file.

    Attributes
    ----------
    verb : str
        As written in the flow file; the module's name with `_` for `-`.
    settings : type
        The pydantic model of its settings.
    apply : callable
        `(state, settings, tools) -> state`, the step on the structure.
    heights : callable
        `(profile, settings, tools) -> profile`, the same on a one-dimensional profile: the dry run of heights.
    short : str or None
        The setting that a bare word stands for, so that `strip: resist` is `strip: {film: resist}`.
    version : int
        Raised whenever the same settings give another result.
    sources : tuple of str
        What the model rests on.
    doc : str
        The module's docstring, which is the documentation; filled in by the finder.
    """

    verb: str
    settings: type[Any]
    apply: Callable[..., Any]
    heights: Callable[..., Any]
    short: str | None = None
    version: int = 1
    sources: tuple[str, ...] = ()
    doc: str = ""


@dataclass(frozen=True)
class Check:
    """One thing that is looked for.

    Attributes
    ----------
    name : str
        The check's name.
    codes : tuple of str
        The codes of the findings that it may report.
    needs : str
        `flow`, `layout` or `geometry`; `lint` runs the first two.
    run : callable
        `(view) -> iterable of Finding`.
    doc : str
        The module's docstring, which is the documentation; filled in by the finder.
    """

    name: str
    codes: tuple[str, ...]
    needs: str
    run: Callable[[Any], Iterable[Finding]]
    version: int = 1
    sources: tuple[str, ...] = ()
    doc: str = ""


def modules(package: str) -> list[ModuleType]:
    """Every public module of a package, by name; folders and names with a leading underscore are left out."""
    folder = import_module(package)
    names = sorted(m.name for m in iter_modules(folder.__path__) if not m.ispkg and not m.name.startswith("_"))
    return [import_module(f"{package}.{name}") for name in names]


@cache
def step_kinds() -> dict[str, StepKind]:
    """Every step kind by its verb."""
    kinds = {}
    for module in modules("flowemu.steps"):
        kind = _member(module, "KIND", StepKind)
        if kind.verb != _stem(module).replace("_", "-") or kind.verb not in VERBS:
            raise RegistryError(f"{module.__file__}: the verb '{kind.verb}' is not that of the file, or not a verb")
        kinds[kind.verb] = _documented(kind, module)
    return kinds


@cache
def checks() -> dict[str, Check]:
    """Every check by its name."""
    found: dict[str, Check] = {}
    for module in modules("flowemu.checks"):
        check = _member(module, "CHECK", Check)
        if check.needs not in NEEDS:
            raise RegistryError(f"{module.__file__}: needs '{check.needs}', expected one of {', '.join(NEEDS)}")
        if check.name in found:
            raise RegistryError(f"{module.__file__}: there is another check named '{check.name}'")
        found[check.name] = _documented(check, module)
    return found


def finding_codes() -> dict[str, Check]:
    """Every code that a check may report, and that check."""
    return {code: check for check in checks().values() for code in check.codes}


def _member(module: ModuleType, name: str, wanted: type[Kind]) -> Kind:
    member = getattr(module, name, None)
    if not isinstance(member, wanted):
        raise RegistryError(f"{module.__file__}: expected a {wanted.__name__} named {name}")
    return member


def _documented(kind: Kind, module: ModuleType) -> Kind:
    if not (module.__doc__ or "").strip():
        raise RegistryError(f"{module.__file__}: has no docstring, which is its documentation")
    return replace(kind, doc=(module.__doc__ or "").strip())


def _stem(module: ModuleType) -> str:
    return module.__name__.rpartition(".")[2]
