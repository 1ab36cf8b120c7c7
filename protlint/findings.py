"""What a review says: findings, their working, and what was not checked."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

Level = Literal["error", "warning", "note"]
"""The three levels of a finding; the words are SARIF 2.1.0's."""

FOR_WANT_OF = "for want of "
"""How it begins why a circuit was not solved, where it is data that lack."""

UNSOLVED = "currents"
"""What was not checked of a limiter whose circuit could not be solved: all that follows from its currents."""

LEVELS: tuple[Level, ...] = ("error", "warning", "note")
"""Worst first."""


IDENTIFYING_ROLES = ("pass", "driver", "sense", "shunt")
"""The roles whose parts say which limiter it is: what is added to mend a finding must not rename the others."""


def some_of(names: Sequence[str], most: int = 6) -> str:
    """Return names joined by commas, the rest of a long list counted."""
    more = len(names) - most
    return ", ".join(names[:most]) + (f" and {more} more" if more > 0 else "")


def identifying_parts(roles: Mapping[str, Sequence[str]]) -> tuple[str, ...]:
    """Return the parts a limiter is known by in fingerprints, from its report roles."""
    return tuple(part for role in IDENTIFYING_ROLES for part in roles.get(role, ()))


def fingerprint(finding: Finding, limiter_parts: Sequence[str] = ()) -> str:
    """Return the name a finding keeps from one revision of a board to the next.

    It is made of the check, the parts that identify the limiter, the finding's own parts and its subject. Lines, net names,
    figures and the order of parts do not go into it, nor does the case of a designator, which exporters change.
    """
    facts = [
        finding.check,
        sorted(part.casefold() for part in limiter_parts),
        sorted(part.casefold() for part in finding.parts),
        finding.subject,
    ]
    digest = hashlib.sha256(json.dumps(facts).encode("ascii")).hexdigest()
    return f"{finding.check}-{digest[:12]}"


def stamp_fingerprints(
    findings: Iterable[Finding], limiter_parts: Mapping[str, Sequence[str]] | None = None
) -> tuple[Finding, ...]:
    """Return the findings with their fingerprints, none twice: a repeated one is counted on, ``-2``, ``-3`` ...

    ``limiter_parts`` gives the identifying parts by limiter id; a finding about the board has none.
    """
    known = limiter_parts or {}
    seen: dict[str, int] = {}
    stamped = []
    for finding in findings:
        name = fingerprint(finding, known.get(finding.limiter or "", ()))
        seen[name] = seen.get(name, 0) + 1
        stamped.append(replace(finding, fingerprint=name if seen[name] == 1 else f"{name}-{seen[name]}"))
    return tuple(stamped)


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
class Fit:
    """A part that a remedy fits: its value in SI units, and its rated dissipation where that matters.

    A capacitor of 0 F is taken out. One that is added has no part id, but the two ``nodes`` of the circuit it goes between.
    """

    part: str
    value: float
    power_W: float | None = None
    nodes: tuple[str, ...] = ()


Remedy = tuple[str | None, tuple[Fit, ...]]
"""What to do in words (None where it cannot be told), and the parts it fits: none where it is no matter of values."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One check's answer about one limiter (or, with ``limiter`` None, about the board) when something is wrong.

    A check fills in ``check``, ``limiter``, ``parts``, ``nets``, ``subject``, ``message``, ``working``, ``remedy``,
    ``fits``, ``assumption`` and, where the catalogue gives it several levels, ``level``. The pipeline stamps the rest.

    ``subject`` tells two findings of one check about the same parts apart (a quantity, a net's role, never a net's
    name or a number that moves with values); it goes into the fingerprint and is not printed.
    ``assumption`` is true where the verdict rests on an assumed value: such a finding is never an error.
    ``fits`` is what the remedy fits, so that it can be judged beforehand what comes of it.
    ``waived`` is the reason a waiver gives, ``waived_by`` who gave it.
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
    fits: tuple[Fit, ...] = ()
    file: str | None = None
    line: int | None = None
    column: int | None = None
    fingerprint: str = ""
    waived: str | None = None
    waived_by: str | None = None


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
