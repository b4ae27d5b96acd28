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
        print(f"{name}: {'passed' if opinion.passed else 'WRONG'}, worst {opinion.worst:.3f} mm")
        for line in (*opinion.faults, *opinion.rest, *opinion.motion, *opinion.needed):
            print(f"  {line}")
    sys.exit(0 if all(verdicts) else 1)
