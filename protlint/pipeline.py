"""The road end to end: files in, a review out."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from protlint.board.graph import Board
from protlint.findings import Finding, NotChecked
from protlint.limits import LimiterLimits, Limits
from protlint.solve.circuit import Circuit
from protlint.solve.solution import Solution
from protlint.topology.limiter import Found, Limiter

Verdict = Literal["passes", "fails", "rests on assumptions", "not judged"]
"""``fails`` with an error or a warning that is not waived; ``not judged`` where the circuit could not be solved; ``rests on
assumptions`` where a verdict leans on an assumed value; else ``passes``."""


@dataclass(frozen=True, slots=True)
class ReviewedLimiter:
    """One limiter with everything that was worked out and asked."""

    limiter: Limiter
    needs: LimiterLimits
    circuit: Circuit | None
    solution: Solution
    verdict: Verdict
    not_checked: tuple[NotChecked, ...] = ()
    assumed: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Review:
    """The whole answer for one netlist; the findings in report order (worst limiter first, then worst finding)."""

    board: Board
    limits: Limits
    found: Found
    limiters: tuple[ReviewedLimiter, ...]
    findings: tuple[Finding, ...]
    assumed: tuple[str, ...] = ()
    """What was assumed about the board as a whole."""
    remarks: tuple[str, ...] = field(default_factory=tuple)
    """Said once, below everything: expired waivers, waivers that match nothing."""
