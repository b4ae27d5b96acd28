"""Habits of the house that a linter does not know, or that must not be waived line by line."""

from __future__ import annotations

import ast
import re
import shutil
import subprocess

import pytest
from helpers.source import CHECKOUT, modules, tree

MAY_CATCH_ALL = {
    "moldgen.kernel.guard": "kernel exceptions share no base class",
    "moldgen.flow.child": "the worker's outermost handler",
    "moldgen.cli": "the outermost handler of the command line",
    "moldgen.flow.part_source": "what the user's own Python function raises is his, not ours",
}

PROGRAMS = {"moldgen.output.pictures": "a program of its own, whose lines the worker reads"}

TOP = {"README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml", "moldgen", "specs", "tests", "out"}
"""What may stand in the top folder, besides names that begin with a dot."""

THIS_MACHINE = re.compile("/" + r"(work|tmp/w|home|root)/\w")


@pytest.mark.parametrize("module", modules())
def test_only_outermost_handlers_catch_everything(module: str) -> None:
    broad = [n.lineno for n in ast.walk(tree(module)) if isinstance(n, ast.ExceptHandler) and catches_all(n)]
    assert module in MAY_CATCH_ALL or not broad, f"{module}: broad except in lines {broad}"


def catches_all(handler: ast.ExceptHandler) -> bool:
    if handler.type is None:
        return True
    return any(isinstance(n, ast.Name) and n.id in ("Exception", "BaseException") for n in ast.walk(handler.type))


@pytest.mark.parametrize("module", [m for m in modules() if m not in PROGRAMS])
def test_nothing_prints(module: str) -> None:
    called = [(n.lineno, ast.unparse(n.func)) for n in ast.walk(tree(module)) if isinstance(n, ast.Call)]
    assert [place for place in called if place[1] in ("print", "sys.stdout.write", "sys.stderr.write")] == []


@pytest.mark.parametrize("module", modules())
def test_public_names_say_what_they_are(module: str) -> None:
    assert ast.get_docstring(tree(module)) or not tree(module).body, f"{module} has no docstring"
    for node in tree(module).body:
        if not isinstance(node, ast.FunctionDef | ast.ClassDef) or node.name.startswith("_"):
            continue
        assert ast.get_docstring(node), f"{module}:{node.name} has no docstring"
        methods = [m for m in node.body if isinstance(m, ast.FunctionDef)] if isinstance(node, ast.ClassDef) else []
        silent = [m.name for m in methods if not m.name.startswith("_") and not ast.get_docstring(m)]
        assert not silent, f"{module}:{node.name}: no docstring on {silent}"


@pytest.mark.parametrize("module", modules())
def test_there_are_no_globals(module: str) -> None:
    assert not [n.lineno for n in ast.walk(tree(module)) if isinstance(n, ast.Global)]


def tracked() -> list[str]:
    if shutil.which("git") is None or not (CHECKOUT / ".git").exists():
        pytest.skip("not a git checkout")
    words = ["git", "-c", f"safe.directory={CHECKOUT}", "ls-files", "-z"]
    return (
        subprocess.run(words, cwd=CHECKOUT, capture_output=True, text=True, check=True).stdout.strip("\0").split("\0")
    )


def test_the_top_folder_holds_what_it_should() -> None:
    assert {name.partition("/")[0] for name in tracked() if not name.startswith(".")} <= TOP


def test_no_file_names_a_place_of_one_machine() -> None:
    texts = (".py", ".md", ".toml", ".yaml", ".yml", ".csv", ".step", "LICENSE", "run")
    files = [CHECKOUT / p for p in tracked() if p.endswith(texts) and (CHECKOUT / p).is_file()]
    assert [f.name for f in files if THIS_MACHINE.search(f.read_text(encoding="utf-8"))] == []


def test_no_large_file_is_tracked() -> None:
    sizes = {p: (CHECKOUT / p).stat().st_size for p in tracked() if (CHECKOUT / p).is_file()}
    assert {p: s for p, s in sizes.items() if s > 1_000_000} == {}
