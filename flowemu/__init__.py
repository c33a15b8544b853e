"""flowemu runs a microfabrication step list on a mask layout and says what goes wrong, where and why."""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_PUBLIC = {
    "Finding": "flowemu.findings",
    "FlowemuError": "flowemu.errors",
    "InputError": "flowemu.errors",
    "load_flow": "flowemu.flow.load",
    "run_flow": "flowemu.engine",
}
__all__ = ["__version__", *_PUBLIC]


def __getattr__(name: str) -> Any:
    """The public names, imported when they are first asked for, so that the command line starts fast."""
    if name in _PUBLIC:
        return getattr(import_module(_PUBLIC[name]), name)
    raise AttributeError(f"module 'flowemu' has no attribute '{name}'")
