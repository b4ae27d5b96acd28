"""`moldgen new`: a commented starter spec for a STEP file, which builds as written."""

from __future__ import annotations

import os
from pathlib import Path

from moldgen.errors import ExitCode
from moldgen.flow.job import JobResult
from moldgen.flow.tell import Tell
from moldgen.kernel.measure import bounding_box
from moldgen.kernel.step_read import read_step
from moldgen.spec.describe import starter
from moldgen.spec.schema import folder_name


def starter_spec(part: Path, output: Path, resin: str, tell: Tell) -> tuple[str, JobResult]:
    """Return the text of the spec and what to tell the user.

    Raises
    ------
    PartError : the file cannot be read as one solid part
    """
    with tell.stage("read the part") as stage:
        read = read_step(part)
        low, high = bounding_box(read.solid)
        size = " x ".join(f"{b - a:.2f}" for a, b in zip(low, high, strict=True))
        stage.detail = f"{size} mm"
    facts = (f"{size} mm, {read.volume_mm3 / 1000:.3f} cm3", f"{read.schema}, drawn in {read.unit}")
    beside = os.path.relpath(os.fspath(part), os.fspath(output.parent))
    text = starter(Path(beside).as_posix(), folder_name(part.stem), resin or "ABS", facts=facts)
    headline = f"a spec to start from: edit it, then run `moldgen build {output}`"
    return text, JobResult(ExitCode.OK, headline)
