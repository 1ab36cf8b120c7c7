"""The book of part data: ratings and models by part number, each figure with where it comes from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class Figure:
    """One rating: SI value (temperatures in degC) and its source (a publication, or the word ``memory``)."""

    value: float
    source: str


@dataclass(frozen=True, slots=True)
class SafeArea:
    """One curve of a safe operating area: how long it may last (``inf`` for dc) and its (V, A) corners at 25 degC case."""

    lasts_s: float
    points: tuple[tuple[float, float], ...]
    source: str


@dataclass(frozen=True, slots=True)
class PartEntry:
    """All that is known of one part type.

    ``ratings`` is keyed by the rating's name in the part-data file (``vceo``, ``power``, ``hfe_min`` ...); ``model`` holds
    published model parameters in SI units at 27 degC (empty where none are known) and ``model_source`` where they come
    from; ``pins`` maps a pin name or number to its role.
    """

    part_number: str
    kind: str
    pins: Mapping[str, str] = field(default_factory=dict)
    ratings: Mapping[str, Figure] = field(default_factory=dict)
    model: Mapping[str, float] = field(default_factory=dict)
    model_source: str | None = None
    safe_area: tuple[SafeArea, ...] = ()
    source: str = "memory"
    file: str | None = None


@dataclass(frozen=True, slots=True)
class Book:
    """Part entries by part number; look-ups fold case and try the user's files before protlint's own."""

    entries: Mapping[str, PartEntry]

    def find(self, part_number: str) -> PartEntry | None:
        """Return the entry for a part number, or None."""
        return self.entries.get(part_number.strip().casefold())
