"""Values that are allowed but look like a slip."""

from __future__ import annotations

from typing import Final

from moldgen.finding import Finding, Severity
from moldgen.spec.schema import Spec
from moldgen.spec.tree import Tree

LARGE_SHRINK: Final = 20.0
"""%. No thermoplastic shrinks so much; sintered feedstocks do (common practice: 15-20 %)."""

SMALL_SHRINK: Final = 0.05
"""%. Below that a ratio such as 0.005 mm/mm was probably written as a percentage (our choice)."""


def cautions(spec: Spec, tree: Tree) -> tuple[Finding, ...]:
    """Return a finding for each value of `spec` that is likely a slip."""
    percent = spec.shrink.percent or ()
    where = tree.where(("shrink",), value=True)
    found = []
    if percent and max(percent) >= LARGE_SHRINK:
        found.append(
            Finding(
                "shrink.large",
                Severity.WARNING,
                f"a shrink of {max(percent):g} % is larger than that of any thermoplastic",
                where=where,
                value=max(percent),
                limit=LARGE_SHRINK,
                unit="%",
                remedy="check that it is meant in percent",
            )
        )
    small = [s for s in percent if 0.0 < s < SMALL_SHRINK]
    if small:
        found.append(
            Finding(
                "shrink.small",
                Severity.WARNING,
                f"a shrink of {min(small):g} % is very small",
                where=where,
                value=min(small),
                limit=SMALL_SHRINK,
                unit="%",
                remedy=f'plain numbers are percent: if a ratio was meant, write "{min(small):g} mm/mm"',
            )
        )
    return tuple(found)
