"""Nothing grows past what one can read: files, functions, argument lists. What is too large today may only shrink."""

from __future__ import annotations

import ast

import pytest
from helpers.source import CHECKOUT, functions, modules

LINES_OF_A_FILE = 400
LINES_OF_A_BODY = 50
ARGUMENTS = 7

TOO_LARGE: dict[str, int] = {}
"""Files and functions (``path`` or ``module:function``) over the limit, with their size; never add, never raise."""


def source_files() -> list[str]:
    files = [*CHECKOUT.glob("moldgen/**/*.py"), *CHECKOUT.glob("tests/**/*.py"), *CHECKOUT.glob("specs/**/*.py")]
    return sorted(path.relative_to(CHECKOUT).as_posix() for path in files)


def fits(name: str, size: int, limit: int) -> None:
    if name in TOO_LARGE:
        assert size <= TOO_LARGE[name], f"{name} has grown from {TOO_LARGE[name]} to {size} lines"
        assert size == TOO_LARGE[name], f"{name} has shrunk to {size} lines: lower its entry, or remove it at {limit}"
    assert size <= max(limit, TOO_LARGE.get(name, 0)), f"{name} has {size} lines, the limit is {limit}: split it"


@pytest.mark.parametrize("path", source_files())
def test_a_file_is_at_most_four_hundred_lines(path: str) -> None:
    fits(path, len((CHECKOUT / path).read_text(encoding="utf-8").splitlines()), LINES_OF_A_FILE)


@pytest.mark.parametrize("module", modules())
def test_a_function_fits_a_screen_and_has_few_arguments(module: str) -> None:
    for name, function in functions(module):
        body = function.body[1:] if ast.get_docstring(function) is not None else function.body
        size = body[-1].end_lineno - body[0].lineno + 1 if body else 0
        fits(f"{module}:{name}", size, LINES_OF_A_BODY)
        given = function.args
        names = [a.arg for a in (*given.posonlyargs, *given.args, *given.kwonlyargs) if a.arg not in ("self", "cls")]
        assert len(names) <= ARGUMENTS, f"{module}:{name} takes {len(names)} arguments, the limit is {ARGUMENTS}"


def test_what_is_listed_as_too_large_exists() -> None:
    known = {*source_files(), *(f"{m}:{name}" for m in modules() for name, _ in functions(m))}
    assert TOO_LARGE.keys() <= known
