"""Imports run one way, service to worker to client, and never in a circle."""

import ast
from collections.abc import Iterator
from graphlib import CycleError, TopologicalSorter
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
SOURCES = {"sweepmill": ROOT / "client", "sweepmill_worker": ROOT / "worker", "sweepmill_service": ROOT / "service"}
FORBIDDEN = {"sweepmill": ("sweepmill_worker", "sweepmill_service"), "sweepmill_worker": ("sweepmill_service",)}


def module_name(path: Path, root: Path) -> str:
    parts = path.relative_to(root).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


MODULES = {
    module_name(path, root): path for name, root in SOURCES.items() for path in sorted((root / name).rglob("*.py"))
}


def imported(node: ast.AST, inside: bool = False) -> Iterator[tuple[str, bool]]:
    """Modules that are imported, and whether only inside a function; what only type checkers see is left out."""
    for child in ast.iter_child_nodes(node):
        if isinstance(child, ast.Import):
            yield from ((alias.name, inside) for alias in child.names)
        elif isinstance(child, ast.ImportFrom):
            assert child.level == 0, "imports are absolute"
            for alias in child.names:
                full = f"{child.module}.{alias.name}"
                yield full if full in MODULES else str(child.module), inside
        elif not (isinstance(child, ast.If) and "TYPE_CHECKING" in ast.unparse(child.test)):
            yield from imported(child, inside or isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef))


IMPORTS = {name: list(imported(ast.parse(path.read_text(encoding="utf-8")))) for name, path in MODULES.items()}


@pytest.mark.parametrize("package", FORBIDDEN)
def test_imports_run_one_way(package: str) -> None:
    wrong = [
        f"{module} imports {target}"
        for module, targets in IMPORTS.items()
        for target, inside in targets
        if module.partition(".")[0] == package
        and target.partition(".")[0] in FORBIDDEN[package]
        and not (inside and module.startswith(("sweepmill.cli.", "sweepmill.demo")))
    ]
    assert not wrong


def test_no_module_imports_itself_by_a_detour() -> None:
    graph = {
        module: {target for target, inside in targets if target in MODULES and not inside}
        for module, targets in IMPORTS.items()
    }
    try:
        TopologicalSorter(graph).prepare()
    except CycleError as error:
        pytest.fail(" -> ".join(error.args[1]))
