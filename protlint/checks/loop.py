"""Is the limiting loop stable."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.checks.case import Answer, Case
from protlint.findings import WorkingLine


def compensation_absent(case: Case) -> Iterator[Answer]:
    """Yield a finding where no capacitor shapes the loop, at a level that follows the computed damping."""
    check = "compensation-absent"
    if case.parts("compensation"):
        return
    loop = case.solution.loop
    if loop is None or loop.least_damping is None:
        yield case.finding(
            check,
            "no capacitor shapes the limiting loop; its damping was not computed",
            parts=case.parts("shunt"),
            working=(),
            remedy="a capacitor from the collector to the base of the shunt, sized by measuring the settling into a short",
            level="note",
        )
        return
    damping = loop.worst_damping if loop.worst_damping is not None else loop.least_damping
    poor = damping < case.threshold(check, "warning")
    yield case.finding(
        check,
        f"no capacitor shapes the limiting loop; its damping is {damping:.2g}, which is {'poor' if poor else 'enough'}",
        parts=case.parts("shunt"),
        working=(WorkingLine("least damping", "natural frequencies of G + sC at the held short", damping, ""),),
        remedy="fit a capacitor from the collector to the base of the shunt" if poor else None,
        level="warning" if poor else "note",
    )
