"""The source of moldgen as the structure tests see it: modules, their syntax trees, what they import of each other."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from functools import cache
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parents[2]
PACKAGE = CHECKOUT / "moldgen"

FLOORS: dict[str, int] = {
    **dict.fromkeys(["", "errors", "units", "tolerances", "quantity", "finding", "canon", "tether", "memory"], 0),
    **dict.fromkeys(["catalog", "rules", "model"], 1),
    "spec": 2,
    "kernel": 3,
    "release": 4,
    **dict.fromkeys(["parting", "steel", "layout"], 5),
    "proof": 6,
    **dict.fromkeys(["output", "revision"], 7),
    "flow": 8,
    "cli": 9,
    "__main__": 10,
}
"""The floor of every module and folder directly in moldgen/ ("" is its __init__)."""


@cache
def modules() -> dict[str, Path]:
    """Every module of moldgen by its dotted name."""
    found = {}
    for path in sorted(PACKAGE.rglob("*.py")):
        parts = path.relative_to(CHECKOUT).with_suffix("").parts
        found[".".join(parts[:-1] if parts[-1] == "__init__" else parts)] = path
    return found


@cache
def tree(module: str) -> ast.Module:
    """The syntax tree of a module."""
    return ast.parse(modules()[module].read_text(encoding="utf-8"))


def room(module: str) -> str:
    """The module or folder directly in moldgen/ that holds `module`."""
    return module.partition(".")[2].partition(".")[0]


@cache
def imported(module: str, *, at_run_time: bool = False) -> frozenset[str]:
    """Dotted names of what `module` imports, also inside functions; of a package of ours, the module where it is one.

    With `at_run_time`, what stands under ``if TYPE_CHECKING`` is left out.
    """
    nodes = set(ast.walk(tree(module)))
    if at_run_time:
        typing_only = [n for n in nodes if isinstance(n, ast.If) and ast.unparse(n.test) == "TYPE_CHECKING"]
        nodes -= {inner for n in typing_only for statement in n.body for inner in ast.walk(statement)}
    return frozenset(name for node in nodes for name in _imported(node))


def _imported(node: ast.AST) -> Iterator[str]:
    if isinstance(node, ast.Import):
        yield from (alias.name for alias in node.names)
    elif isinstance(node, ast.ImportFrom):
        assert node.level == 0, "a relative import"
        assert node.module is not None
        for alias in node.names:
            below = f"{node.module}.{alias.name}"
            yield below if below in modules() else node.module


def functions(module: str) -> Iterator[tuple[str, ast.FunctionDef | ast.AsyncFunctionDef]]:
    """Every function of `module` with its qualified name, nested ones too."""

    def walk(node: ast.AST, prefix: str) -> Iterator[tuple[str, ast.FunctionDef | ast.AsyncFunctionDef]]:
        for child in ast.iter_child_nodes(node):
            if isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef):
                yield f"{prefix}{child.name}", child
            if isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef):
                yield from walk(child, f"{prefix}{child.name}.")
            else:
                yield from walk(child, prefix)

    yield from walk(tree(module), "")
