"""Advice for a machine that lacks what the Python wheels expect of the system."""

from __future__ import annotations

import re

from moldgen.errors import KernelError

PACKAGES = ("libgl1", "libegl1")
"""Debian packages that bring every library the wheels load and do not ship [tried in a minimal Debian 12]:

libGL.so.1, libX11.so.6 and libexpat.so.1 (cadquery-ocp, on import) come with libgl1; libEGL.so.1 (vtk, which opens it
for pictures without a display) with libegl1.
"""

TEST_PACKAGES = ("libglu1-mesa", "libxft2", "libxinerama1", "libxcursor1", "libgomp1")
"""What the tests need besides: their second STEP reader, gmsh, brings a window system's libraries into play."""

APT_LINE = f"sudo apt-get install -y {' '.join(PACKAGES)}"

_SHARED_OBJECT = re.compile(r"([\w.+-]+\.so[\w.]*): cannot open shared object file")


def explain_import(error: ImportError) -> KernelError | None:
    """Return what to tell a user whose machine lacks a system library or a Python package; `None`: not such a case."""
    library = _SHARED_OBJECT.search(str(error))
    if library:
        what = f"the geometry kernel cannot be loaded: the system library {library[1]} is missing"
        return KernelError(what, remedy=f"{APT_LINE}   (Debian, Ubuntu; see README.md)")
    package = (error.name or "").partition(".")[0]
    if isinstance(error, ModuleNotFoundError) and package and package != "moldgen":
        what = f"the Python package that provides '{package}' is missing"
        return KernelError(what, remedy="install moldgen again into this environment: pip install --force-reinstall .")
    return None
