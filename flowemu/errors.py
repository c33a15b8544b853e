"""Faults of the input and of the run, as one clear line each."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches


@dataclass(frozen=True, order=True)
class Fault:
    """One thing wrong with the input, and where it stands.

    `file`, `line` and `column` (both from 1) are None where no place in a file is at fault.
    """

    file: str | None
    line: int | None
    column: int | None
    text: str

    def __str__(self) -> str:
        if self.file is None or self.line is None:
            return f"{self.file or 'flowemu'}: {self.text}"
        return f"{self.file}:{self.line}:{self.column or 1}: {self.text}"


def near_miss(word: str, known: Iterable[str]) -> str:
    """The known word that `word` was probably meant to be, or an empty text."""
    by_lower = {name.lower(): name for name in known}
    close = get_close_matches(word.lower(), list(by_lower), n=1, cutoff=0.6)
    return by_lower[close[0]] if close else ""


def hint(word: str, known: Iterable[str], others: str = "expected one of") -> str:
    """The tail of a complaint: the near miss, or else what there is; empty where nothing is known."""
    names = list(dict.fromkeys(known))
    close = near_miss(word, names)
    if close:
        return f"; did you mean '{close}'?"
    return f"; {others} {', '.join(names)}" if names else ""


class FlowemuError(Exception):
    """Base of all that a user can cause; the command line prints it without a traceback."""

    exit_status = 2

    def lines(self) -> list[str]:
        return [f"flowemu: {self}"]


class InputError(FlowemuError):
    """The flow, layout or command line is wrong; carries every fault that was found."""

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = sorted(set(faults), key=lambda f: (f.file or "", f.line or 0, f.column or 0, f.text))
        super().__init__("; ".join(str(fault) for fault in self.faults))

    def lines(self) -> list[str]:
        return [str(fault) for fault in self.faults]


class RunError(FlowemuError):
    """The run could not be made although the input reads well."""


class LayoutError(FlowemuError):
    """The layout file is missing, damaged or lacks what was asked of it."""


class StepError(RunError):
    """A step cannot be carried out on the structure it meets; the engine adds its place."""
