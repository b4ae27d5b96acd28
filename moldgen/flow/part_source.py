"""The part of a spec: read from a STEP file, built from a recipe, or returned by the user's own function."""

from __future__ import annotations

import importlib.util
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

from moldgen.canon import sha256_bytes, sha256_json
from moldgen.errors import MoldgenError, PartError, SpecError
from moldgen.finding import Finding, Notes, Severity
from moldgen.kernel.features import build_recipe
from moldgen.kernel.heal import heal
from moldgen.kernel.measure import area, volume
from moldgen.kernel.step_read import check_size, read_step
from moldgen.kernel.topology import faces_of
from moldgen.model.part import HealNote, Part
from moldgen.spec.load import LoadedSpec


def read_part(loaded: LoadedSpec) -> tuple[Part, Notes]:
    """Return the part of a spec in its own coordinates [mm], healed where needed.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be read, built or healed
    """
    source = loaded.spec.part
    if source.file is not None:
        part = _from_file(loaded)
    elif source.recipe is not None:
        recipe = source.recipe.resolve()
        try:
            solid = build_recipe(recipe)
            check_size(solid, "check the units of the recipe: plain numbers are mm")
        except MoldgenError as error:
            error.where = error.where or loaded.locate("part.recipe")
            raise
        part = _part(loaded.spec.name, solid, sha256_json(recipe), ())
    else:
        part = _from_function(loaded)
    return part, Notes(findings=tuple(_healed(note) for note in part.healed))


def part_in_file(path: Path, choose: int | str | None = None) -> Part:
    """Return the part in a STEP file."""
    read = read_step(path, choose, find_crossings=False)
    return _part(read.name, read.solid, read.sha256, read.healed, read.volume_mm3)


def _from_file(loaded: LoadedSpec) -> Part:
    path = loaded.part_file
    if path is None:
        raise AssertionError("a spec with part.file has a part file")
    try:
        part = part_in_file(path, loaded.spec.part.solid)
    except PartError as error:
        error.where = f"{loaded.locate('part.file')}: {error.where}"
        raise
    return replace(part, name=loaded.spec.name)


def _from_function(loaded: LoadedSpec) -> Part:
    """Run the user's function: only reached when the command line allowed code."""
    source, where = loaded.spec.part.function or "", loaded.locate("part.function")
    path = loaded.part_file
    if path is None or not path.is_file():
        raise SpecError(f"there is no file {path}", where=where, remedy="correct part.function")
    function = _imported(path, source.rpartition(":")[2], where)
    try:
        result = function()
    except Exception as error:
        raise PartError(
            f"{source} raised {type(error).__name__}: {error}", where=where, remedy="correct the function"
        ) from error
    shape = getattr(result, "wrapped", result) if not hasattr(result, "val") else result.val().wrapped
    if not hasattr(shape, "ShapeType"):
        what = f"{source} returned {type(result).__name__}, not a solid"
        raise PartError(what, where=where, remedy="return a cadquery solid or workplane, or a kernel shape")
    try:
        healed = heal(shape)
        check_size(healed.solid, f"{source} counts in mm")
    except PartError as error:
        error.where = f"{where}: {error.where}" if error.where else where
        raise
    return _part(loaded.spec.name, healed.solid, sha256_bytes(path.read_bytes()), healed.notes, healed.volume_mm3)


def _imported(path: Path, name: str, where: str) -> Callable[[], Any]:
    found = importlib.util.spec_from_file_location("moldgen_user_part", path)
    if found is None or found.loader is None:
        raise SpecError(f"{path.name} cannot be imported", where=where, remedy="name a Python file")
    module = importlib.util.module_from_spec(found)
    try:
        found.loader.exec_module(module)
    except Exception as error:
        raise PartError(
            f"{path.name} raised {type(error).__name__}: {error}", where=where, remedy="correct the file"
        ) from error
    function = getattr(module, name, None)
    if not callable(function):
        raise SpecError(f"{path.name} has no function {name}", where=where, remedy="correct part.function")
    return function  # type: ignore[no-any-return]


def _part(name: str, solid: Any, sha256: str, healed: tuple[HealNote, ...], mm3: float | None = None) -> Part:
    mm3 = volume(solid) if mm3 is None else mm3
    return Part(name, solid, sha256, mm3, area(solid), len(faces_of(solid)), healed=healed)


def _healed(note: HealNote) -> Finding:
    return Finding(
        code="part.healed",
        severity=Severity.NOTE if note.volume_change_mm3 == 0.0 else Severity.CAUTION,
        message=f"{note.what}: {note.count}",
        where="part",
        value=note.volume_change_mm3,
        unit="mm^3",
        remedy="" if note.volume_change_mm3 == 0.0 else "compare the part with your CAD",
    )
