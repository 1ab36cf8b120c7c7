"""What a review says: findings, their working, and what was not checked."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Level = Literal["error", "warning", "note"]
"""The three levels of a finding; the words are SARIF 2.1.0's."""

LEVELS: tuple[Level, ...] = ("error", "warning", "note")
"""Worst first."""


@dataclass(frozen=True, slots=True)
class WorkingLine:
    """One line of calculation behind a finding, so that a person can follow it by hand.

    ``quantity`` is what was computed, ``formula`` how (with the numbers put in), ``value`` the result in SI units,
    ``unit`` its unit's symbol and ``source`` where the formula or the figure was published.
    """

    quantity: str
    formula: str
    value: float | None
    unit: str
    source: str | None = None


@dataclass(frozen=True, slots=True)
class Finding:
    """One check's answer about one limiter (or, with ``limiter`` None, about the board) when something is wrong.

    A check fills in ``check``, ``limiter``, ``parts``, ``nets``, ``subject``, ``message``, ``working``, ``remedy``,
    ``assumption`` and, where the catalogue gives it several levels, ``level``. The pipeline stamps the rest.

    ``subject`` tells two findings of one check about the same parts apart (a quantity, a net's role, never a net's
    name or a number that moves with values); it goes into the fingerprint and is not printed.
    ``assumption`` is true where the verdict rests on an assumed value: such a finding is never an error.
    """

    check: str
    limiter: str | None
    parts: tuple[str, ...]
    message: str
    nets: tuple[str, ...] = ()
    working: tuple[WorkingLine, ...] = ()
    remedy: str | None = None
    assumption: bool = False
    subject: str = ""
    level: Level | None = None
    file: str | None = None
    line: int | None = None
    column: int | None = None
    fingerprint: str = ""
    waived: str | None = None


@dataclass(frozen=True, slots=True)
class NotChecked:
    """A check that could not be done, and what would let it be done (the exact key where a key is missing)."""

    check: str
    needs: str


@dataclass(frozen=True, slots=True)
class Warning:
    """Something met while reading that was dealt with in a stated way; one per kind and file, with a count."""

    message: str
    line: int | None = None
    column: int | None = None
    count: int = 1
