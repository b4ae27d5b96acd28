"""A spec file to a checked, immutable spec. Every mistake is reported with its place, several at once."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final, NoReturn

from pydantic import ValidationError

from moldgen.canon import sha256_bytes
from moldgen.errors import SpecError, SpecErrors
from moldgen.finding import Finding
from moldgen.model.accepted import Accepted
from moldgen.spec.cautions import cautions
from moldgen.spec.messages import plain_errors
from moldgen.spec.schema import Spec, folder_name
from moldgen.spec.tree import Tree, read_tree

MAX_BYTES: Final = 1_000_000
"""Size of the largest spec file that is read."""

MAX_REPORTED: Final = 30
"""Mistakes reported at once; the rest are counted."""

_CODE_NEEDS_FLAG: Final = "the part comes from Python code, and code from a spec does not run unless you say so"
_EXAMPLE: Final = "`moldgen new PART.step` writes a spec to start from"


@dataclass(frozen=True)
class LoadedSpec:
    """A spec, the file it came from (as the user named it), and where each of its keys stands.

    accepted : the accepted layout beside it, for builds that keep it (see `moldgen.spec.accepted`)
    """

    spec: Spec
    path: Path
    sha256: str
    findings: tuple[Finding, ...]
    _tree: Tree
    accepted: Accepted | None = None

    def locate(self, key: str | tuple[str | int, ...]) -> str:
        """Return ``file:line:column`` of a key, given as ``"gate.at"`` or ``("marks", 0, "face")``.

        A key that the user did not write is located at its section, or at the top of the file.
        """
        return self._tree.where(_path(key))

    def has(self, key: str) -> bool:
        """True if the user wrote this key."""
        return _path(key) in self._tree.values

    @property
    def folder(self) -> Path:
        """Folder of the spec, as the user named it: relative paths in the spec start here."""
        return self.path.parent

    @property
    def part_file(self) -> Path | None:
        """The file that the part is read from (STEP or Python); None for a recipe."""
        source = self.spec.part
        if source.file is not None:
            return self.folder / source.file
        if source.function is not None:
            return self.folder / source.function.rpartition(":")[0]
        return None


def _path(key: str | tuple[str | int, ...]) -> tuple[str | int, ...]:
    if isinstance(key, tuple):
        return key
    return tuple(int(k) if k.isdecimal() else k for k in key.replace("[", ".").replace("]", "").split("."))


def load_spec(path: str | Path, *, allow_code: bool = False) -> LoadedSpec:
    """Return the checked spec in the file `path`.

    A part from a Python function is refused unless `allow_code` is true; nothing is run here either way.

    Raises
    ------
    SpecError : the file cannot be read, is not YAML, or has one mistake
    SpecErrors : the spec has several mistakes
    """
    file = str(path)
    data = read_bytes(Path(path), file)
    tree = read_tree(decode(data, file), file)
    spec = _checked(tree, folder_name(Path(path).stem))
    if spec.part.function is not None and not allow_code:
        where = tree.where(("part", "function"))
        raise SpecError(_CODE_NEEDS_FLAG, where=where, remedy="read the code, then add --allow-code to the command")
    return LoadedSpec(spec, Path(path), sha256_bytes(data), cautions(spec, tree), tree)


# --- the file --------------------------------------------------------------------------------------------------------
def read_bytes(path: Path, file: str) -> bytes:
    """Return what is in a spec, at most `MAX_BYTES`; `file` is its name in messages.

    Raises
    ------
    SpecError : it cannot be read, or cannot be a spec
    """
    try:
        if path.is_dir():
            raise SpecError("this is a folder, not a spec", where=file, remedy="name the .yaml file in it")
        if path.exists() and not path.is_file():
            raise SpecError("this is not a regular file", where=file, remedy="name a .yaml file")
        with path.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
    except FileNotFoundError as error:
        raise SpecError("there is no such file", where=file, remedy=_near_file(path)) from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not a file name"
        raise SpecError(f"the file cannot be read: {reason}", where=file, remedy="check its permissions") from error
    if len(data) > MAX_BYTES:
        raise SpecError(f"the file is larger than {MAX_BYTES:,} bytes", where=file, remedy="name a spec, not a part")
    if data.startswith(b"ISO-10303-21"):
        raise SpecError("this is a STEP file, not a spec", where=file, remedy=_EXAMPLE)
    return data


def _near_file(path: Path) -> str:
    try:
        names = sorted(p.name for p in path.parent.iterdir() if p.suffix in (".yaml", ".yml"))
    except OSError:
        return f"there is no folder {path.parent} either; check the path"
    near = difflib.get_close_matches(path.name, names, n=1)
    return f"did you mean {path.parent / near[0]}?" if near else _EXAMPLE


def decode(data: bytes, file: str) -> str:
    """Return the text in UTF-8. Raises SpecError, with the place, if it is something else."""
    if b"\0" in data:
        raise SpecError("the file is binary, or text in UTF-16", where=file, remedy="save it as text in UTF-8")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        column = error.start - data.rfind(b"\n", 0, error.start)
        what = f"the byte 0x{data[error.start]:02x} is not UTF-8 text"
        raise SpecError(what, where=f"{file}:{line}:{column}", remedy="save the file in UTF-8") from error


# --- the spec --------------------------------------------------------------------------------------------------------
def _checked(tree: Tree, name: str) -> Spec:
    if tree.data is None:
        raise SpecError("the spec is empty", where=tree.file, remedy=_EXAMPLE)
    if not isinstance(tree.data, dict):
        raise SpecError("the spec is not a mapping", where=tree.where((), value=True), remedy="begin with `part:`")
    try:
        spec = Spec.model_validate(_with_name(tree.data, name))
    except ValidationError as error:
        raise_all(tree.mistakes + plain_errors(error, tree), tree.file)
    if tree.mistakes:
        raise_all(tree.mistakes, tree.file)
    return spec


def _with_name(data: Mapping[str, Any], name: str) -> Mapping[str, Any]:
    return data if data.get("name") is not None else {**data, "name": name}


def raise_all(mistakes: list[SpecError], file: str) -> NoReturn:
    """Raise the mistakes of one file, one or several; after `MAX_REPORTED` the rest are counted."""
    if len(mistakes) == 1:
        raise mistakes[0]
    shown = mistakes[:MAX_REPORTED]
    if len(mistakes) > MAX_REPORTED:
        shown.append(
            SpecError(
                f"and at least {len(mistakes) - MAX_REPORTED} more mistakes", where=file, remedy="correct these first"
            )
        )
    raise SpecErrors(shown)
