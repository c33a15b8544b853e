"""The import table of DEVELOPERS.md holds: who may import what, and what `--help` and `lint` must not load."""

from __future__ import annotations

import ast
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[2] / "flowemu"
BASE = {"errors", "units"}
KINDS = BASE | {"registry", "findings", "flow", "layout", "stack", "kernels"}
ENGINE = KINDS | {"steps", "checks", "record"}
EVERYTHING = ENGINE | {"engine", "output", "live", "__version__"}
# Row: what it may import of flowemu, and the third parties for this row (numpy is free to all).
TABLE: dict[str, tuple[set[str], set[str]]] = {
    "errors": (set(), set()),
    "units": ({"errors"}, set()),
    "findings": ({"errors"}, set()),
    "registry": (BASE | {"findings"}, set()),
    "record": ({"findings", "stack"}, set()),
    "__init__": (set(), set()),
    "__main__": ({"cli"}, set()),
    "kernels": (set(), {"numba"}),
    "stack": (BASE | {"kernels"}, {"scipy"}),
    "layout": (BASE | {"kernels", "stack.grid"}, {"gdstk"}),
    "flow": (BASE | {"registry", "findings"}, {"yaml", "pydantic", "pydantic_core"}),
    "steps": (KINDS, {"scipy", "pydantic"}),
    "checks": (KINDS, {"scipy"}),
    "engine": (ENGINE | {"__version__"}, {"scipy", "dask", "zarr"}),
    "output": (
        BASE | {"findings", "record", "flow", "stack", "checks", "__version__"},
        {"pyvista", "trimesh", "matplotlib", "jinja2", "contourpy", "shapely", "manifold3d", "vtk", "vtkmodules"},
    ),
    "live": (EVERYTHING - {"live"}, set()),
    "cli": (EVERYTHING, {"click", "rich"}),
}
# Rows whose files `--help` and `lint` load, and what such a file may not import outside a function.
LIGHT = ("cli", "flow", "layout", "steps", "checks")
HEAVY = {"numba", "scipy", "pyvista", "trimesh", "matplotlib", "gdstk"}
HEAVY_ROWS = {"stack", "kernels", "engine", "output"}


def files() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


def row_of(path: Path) -> str:
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imports(tree: ast.AST, package: str) -> Iterator[tuple[int, str]]:
    """Line and full name of everything imported below a node."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            module = node.module or ""
            if node.level:
                outer = package.split(".")[: len(package.split(".")) - node.level + 1]
                module = ".".join([*outer, module]).rstrip(".")
            yield from ((node.lineno, f"{module}.{alias.name}") for alias in node.names)


def at_start(tree: ast.Module) -> ast.Module:
    """The statements that run when the module is imported: no function bodies, no typing-only imports."""

    class Prune(ast.NodeTransformer):
        def visit_FunctionDef(self, node: ast.FunctionDef) -> None:
            return None

        def visit_If(self, node: ast.If) -> ast.AST | None:
            return None if "TYPE_CHECKING" in ast.unparse(node.test) else node

    pruned: ast.Module = Prune().visit(tree)
    return pruned


def package_of(path: Path) -> str:
    return ".".join(["flowemu", *path.relative_to(PACKAGE).parent.parts])


def allowed(name: str, row: str) -> bool:
    """Whether a file of a row may import this."""
    ours, theirs = TABLE[row]
    top, _, rest = name.partition(".")
    if top != "flowemu":
        return top in sys.stdlib_module_names or top == "numpy" or top in theirs or top == "__future__"
    own = rest.split(".")[0] == row
    return own or any(rest == entry or rest.startswith(f"{entry}.") for entry in ours)


def crosses(path: Path, name: str) -> bool:
    """Whether one step imports another, or one check another; what two share is in a folder or a `_` file."""
    row = row_of(path)
    parts = name.split(".")
    if row not in ("steps", "checks") or parts[:2] != ["flowemu", row] or len(parts) < 3:
        return False
    return not parts[2].startswith("_") and not (PACKAGE / row / parts[2]).is_dir()


@pytest.mark.parametrize("path", files(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_a_file_imports_only_what_its_row_may(path: Path) -> None:
    tree = ast.parse(path.read_text())
    found = list(imports(tree, package_of(path)))
    wrong = [f"line {line}: {name}" for line, name in found if not allowed(name, row_of(path)) or crosses(path, name)]
    assert not wrong


@pytest.mark.parametrize("path", [p for p in files() if row_of(p) in LIGHT], ids=lambda p: str(p.relative_to(PACKAGE)))
def test_what_lint_loads_imports_nothing_heavy_at_its_start(path: Path) -> None:
    if "models" in path.parts or path.name == "child.py":
        pytest.skip("loaded by functions only, or in a process of its own")
    wrong = []
    for line, name in imports(at_start(ast.parse(path.read_text())), package_of(path)):
        parts = name.split(".")
        heavy_row = parts[0] == "flowemu" and len(parts) > 1 and parts[1] in HEAVY_ROWS
        if parts[0] in HEAVY or (heavy_row and name != "flowemu.stack.grid.Grid"):
            wrong.append(f"line {line}: {name}")
    assert not wrong


def test_the_table_has_a_row_for_every_part_of_the_package() -> None:
    assert {row_of(path) for path in files()} <= set(TABLE)


def test_a_forbidden_import_is_seen() -> None:
    """The test itself can fail."""
    tree = ast.parse("def f():\n    from flowemu.stack.stack import FilmStack\n    import scipy.ndimage\n")
    names = [name for _, name in imports(tree, "flowemu.kernels")]
    assert names == ["flowemu.stack.stack.FilmStack", "scipy.ndimage"]
    assert not any(allowed(name, "kernels") for name in names)
    assert list(imports(at_start(tree), "flowemu.kernels")) == []
    assert crosses(PACKAGE / "steps" / "etch.py", "flowemu.steps.release.KIND")
