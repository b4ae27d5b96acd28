"""The real command line with another job in its worker: python moldgen_with.py JOB ARGUMENT..."""

from __future__ import annotations

import sys
from functools import partial

import moldgen.flow.batch
import moldgen.flow.run
import moldgen.flow.watch
from moldgen.cli import main

if __name__ == "__main__":
    entry = sys.argv.pop(1)
    moldgen.flow.run.run = partial(moldgen.flow.run.run, entry=f"helpers.bad_jobs:{entry}")
    moldgen.flow.batch.run_batch = partial(moldgen.flow.batch.run_batch, entry=f"helpers.bad_jobs:{entry}")
    moldgen.flow.watch.watch_spec = partial(
        moldgen.flow.watch.watch_spec, entry=f"helpers.bad_jobs:{entry}", ahead=("moldgen.flow.job",)
    )
    main()
