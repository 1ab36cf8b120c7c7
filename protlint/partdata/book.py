"""The book of part data: ratings and models by part number, each figure with where it comes from.

The way in for those who use part data: what an entry holds is offered here too."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import cache
from pathlib import Path

from protlint.partdata.entry import HfePoint, PartEntry, SafeArea, TransientPoint
from protlint.partdata.file import entries_of
from protlint.partdata.ratings import Figure

__all__ = ["Book", "Figure", "HfePoint", "PartEntry", "SafeArea", "TransientPoint", "load_book"]


@dataclass(frozen=True, slots=True)
class Book:
    """Part entries by part number; look-ups fold case and try the user's files before protlint's own.

    ``remarks`` are about the user's files: a part number in two of them, ratings that contradict each other.
    """

    entries: Mapping[str, PartEntry]
    remarks: tuple[str, ...] = ()
    sizes: Mapping[tuple[str, str], PartEntry] = field(default_factory=dict)
    """Generic entries by kind and size code."""

    def find(self, part_number: str) -> PartEntry | None:
        """Return the entry for a part number, or None."""
        return self.entries.get(part_number.strip().casefold())

    def find_size(self, kind: str, footprint: str) -> PartEntry | None:
        """Return the generic entry for a footprint's size (``R0603``, ``RESC1608X55N``, ``R_0603_1608Metric``), or None.

        A name that holds no size, or two, has none.
        """
        found = {code: self.sizes[kind, code] for code in _size_codes(footprint) if (kind, code) in self.sizes}
        return next(iter(found.values())) if len(found) == 1 else None


_METRIC = {
    "0402": "01005", "0603": "0201", "1005": "0402", "1608": "0603", "2012": "0805", "3216": "1206", "3225": "1210",
    "5025": "2010", "6332": "2512",
}  # fmt: skip
"""IPC-7351 names (``RESC1608X55N``) give a body in tenths of a millimetre; the size code is in hundredths of an inch."""
_METRIC_NAME = re.compile(r"(?:RES|CAP|IND)[CM](\d{4})X", re.IGNORECASE)
_SIZE = re.compile(r"(?<!\d)(?:\d{4}|01005)(?!\d)(?!_?metric)", re.IGNORECASE)


def _size_codes(footprint: str) -> tuple[str, ...]:
    named = _METRIC_NAME.search(footprint)
    if named:
        return (_METRIC[named[1]],) if named[1] in _METRIC else ()
    return tuple(dict.fromkeys(_SIZE.findall(footprint)))


def load_book(paths: Iterable[str | Path] = ()) -> Book:
    """Return the book of the user's part-data files, the first over the later ones, and protlint's own below them.

    Raises
    ------
    FileError : a file cannot be read.
    InputError : not TOML, an unknown key, a wrong unit or an impossible figure, with file, line and column.
    """
    entries: dict[str, PartEntry] = {}
    remarks: list[str] = []
    for path in paths:
        for entry in entries_of(path):
            known = entries.get(entry.part_number.casefold())
            if known is not None:
                remarks.append(f"{entry.part_number} stands in {known.file} and again in {entry.file}: the first counts")
                continue
            entries[entry.part_number.casefold()] = entry
            remarks += [f"{entry.file}: {entry.part_number}: {one.says}" for one in entry.contradictions]
    for entry in _own_entries():
        entries.setdefault(entry.part_number.casefold(), entry)
    sizes: dict[tuple[str, str], PartEntry] = {}
    for entry in entries.values():
        for code in entry.footprints:
            sizes.setdefault((entry.kind, code), entry)
    return Book(entries, tuple(remarks), sizes)


@cache
def _own_entries() -> tuple[PartEntry, ...]:
    paths = sorted(Path(__file__).parent.glob("*.toml"))
    return tuple(replace(entry, file=None) for path in paths for entry in entries_of(path))
