"""Runs flows: applies the steps, keeps the history, calls the checks."""

from __future__ import annotations

from importlib import import_module
from typing import Any

_PUBLIC = {"probe": "points", "run_flow": "run"}
__all__ = list(_PUBLIC)


def __getattr__(name: str) -> Any:
    """The public names, imported when they are first asked for."""
    if name in _PUBLIC:
        return getattr(import_module(f"{__name__}.{_PUBLIC[name]}"), name)
    raise AttributeError(f"module '{__name__}' has no attribute '{name}'")
