"""What besides its inputs decides what a run makes: our own code and data, and the libraries that compute."""

from __future__ import annotations

import platform
from functools import cache
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

import moldgen
from moldgen.canon import sha256_bytes, sha256_json
from moldgen.memory import Memory

LIBRARIES = (
    "cadquery",
    "cadquery-ocp",
    "embreex",
    "manifold3d",
    "numpy",
    "pydantic",
    "scipy",
    "shapely",
    "trimesh",
    "vtk",
)
"""Those whose answers reach an output."""


@cache
def program_sha256() -> str:
    """Return the SHA-256 over the content of moldgen's own code and data.

    Between two releases a checkout has one version and many states.
    """
    top = Path(moldgen.__file__).parent
    files = sorted(p for p in top.rglob("*") if p.suffix in (".py", ".yaml"))
    return sha256_json({p.relative_to(top).as_posix(): sha256_bytes(p.read_bytes()) for p in files})


@cache
def versions() -> dict[str, str]:
    """Return the versions and hashes of everything that computes; a library that is absent has the version ""."""
    found = {name: _version(name) for name in LIBRARIES}
    return {
        "moldgen": moldgen.__version__,
        "program_sha256": program_sha256(),
        "python": platform.python_version(),
        "machine": f"{platform.system()} {platform.machine()}",
        **found,
    }


class Versioned:
    """A memory whose keys also name everything that computes."""

    def __init__(self, memory: Memory) -> None:
        self._memory = memory

    def recall(self, key: str) -> bytes | None:
        """Return what was kept under `key` by the same versions."""
        return self._memory.recall(_versioned(key))

    def keep(self, key: str, data: bytes) -> None:
        """Keep `data` under `key` for the same versions."""
        self._memory.keep(_versioned(key), data)


def _versioned(key: str) -> str:
    return sha256_json({"key": key, "versions": versions()})


def _version(name: str) -> str:
    try:
        return version(name)
    except PackageNotFoundError:
        return ""
