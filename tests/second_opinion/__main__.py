"""`python -m tests.second_opinion FOLDER...`: print all figures of some output folders."""

from __future__ import annotations

import sys
from pathlib import Path

from .judge import judge

if __name__ == "__main__":
    verdicts = []
    for name in sys.argv[1:]:
        opinion = judge(Path(name))
        verdicts.append(opinion.passed)
        sys.stdout.write(f"{name}: {'passed' if opinion.passed else 'WRONG'}, worst {opinion.worst:.3f} mm\n")
        for line in (*opinion.faults, *opinion.rest, *opinion.motion, *opinion.needed):
            sys.stdout.write(f"  {line}\n")
    sys.exit(0 if verdicts and all(verdicts) else 1)
