"""The catalogue of checks: level, thresholds, reason, formula and source of each, from ``rules/checks.toml``.

The file is the one place for these facts; the functions that compute are in the modules beside this one.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from protlint.findings import LEVELS, Level
from protlint.sources import InputError, data_folder
from protlint.toml.file import load_toml

TEXTS = ("level", "says", "why", "formula", "source", "example")
"""What every row states."""


@dataclass(frozen=True, slots=True)
class Threshold:
    """A number a check compares with, its unit's symbol (empty for a ratio), and what it bounds."""

    value: float
    unit: str
    says: str


@dataclass(frozen=True, slots=True)
class CheckRow:
    """One row of the catalogue.

    ``level`` is the level of a finding that states none of its own; ``says`` what is wrong when the check fires, ``why``
    the reason to care, ``formula`` how it is computed, ``source`` where formula and thresholds were published (or
    ``common practice of the trade``, or ``memory``), ``example`` the board among protlint's examples that it fires on,
    ``figures`` the figures of part data that it looks at besides the circuit's models, by the role of the part.
    """

    name: str
    level: Level
    says: str
    why: str
    formula: str
    source: str
    example: str
    thresholds: Mapping[str, Threshold]
    figures: Mapping[str, tuple[str, ...]]


def load_catalogue() -> Mapping[str, CheckRow]:
    """Return every row of ``rules/checks.toml`` by name, in the order of the file.

    Raises
    ------
    InputError : a row lacks a field or states an unknown level, with its place.
    """
    document = load_toml(data_folder("rules") / "checks.toml")
    rows = {}
    for name, table in document.tables.items():
        line, column = document.place((name,))
        missing = [key for key in TEXTS if not isinstance(table.get(key), str)]
        if missing:
            raise InputError(f"check {name} lacks {', '.join(missing)}", file=document.file, line=line, column=column)
        if table["level"] not in LEVELS:
            words = ", ".join(LEVELS)
            raise InputError(f"the level of {name} is one of {words}", file=document.file, line=line, column=column)
        rows[name] = CheckRow(
            name=name,
            level=table["level"],
            says=table["says"],
            why=table["why"],
            formula=table["formula"],
            source=table["source"],
            example=table["example"],
            thresholds={
                key: Threshold(float(row["value"]), row.get("unit", ""), row["says"])
                for key, row in table.get("thresholds", {}).items()
            },
            figures={role: tuple(names) for role, names in table.get("figures", {}).items()},
        )
    return rows
