"""What people see: figures, views, meshes, the numbers and the end of a run."""

from __future__ import annotations

from importlib import import_module
from typing import Any

_PUBLIC = {
    "prepare_folder": "folder",
    "section_polygons": "section",
    "summary": "end_of_run",
    "write_meshes": "deliver",
    "write_run": "deliver",
    "write_sections": "deliver",
}
__all__ = list(_PUBLIC)


def __getattr__(name: str) -> Any:
    """The public names, imported when they are first asked for."""
    if name in _PUBLIC:
        return getattr(import_module(f"{__name__}.{_PUBLIC[name]}"), name)
    raise AttributeError(f"module '{__name__}' has no attribute '{name}'")
