"""What a reader met and dealt with: one warning for each kind, with the first place and a count."""

from __future__ import annotations

from protlint.findings import Warning
from protlint.netlist.forms import Places

KINDS = {
    "encoding": "characters outside ASCII, whose code page no EDIF file states: {}",
    "percent": "a per cent sign without its partner in a string; it is kept as it stands, as in {}",
    "identifier": "a name that EDIF does not allow without a rename; it is taken as it stands: {}",
    "duplicate": "one identifier for two things in one scope; both are kept, and references go to the one named like their "
    "net, else to the first: {}",
    "case": "identifiers that differ only in case, which EDIF takes as one; they are kept apart by their case: {}",
    "reference": "a reference that leads nowhere, and joins nothing: {}",
    "library": "a cell that is not in the library a reference names; one of its name elsewhere is taken: {}",
    "cell": "a cell that is not in the file; what is placed of it is kept as a part: {}",
    "port": "a port that its cell does not declare; it is taken as one all the same: {}",
    "view": "a view that is named and absent; the cell's best other view is taken: {}",
    "designs": "{}",
    "global": "a globalPortRef: all of one name are taken as one net of the whole design: {}",
    "ripper": "a ripper or tie whose cell says not which of its ports are one; nothing is joined through it: {}",
    "width": "things of different width are joined: {}",
    "block pin": "a block's port on two nets, which are taken as one: {}",
    "two nets": "a pin on two nets, which by the standard are one node: {}",
    "property": "one property with two values; the first counts: {}",
    "spread": "a value with its least and most, of which nothing is made; the nominal counts, its tolerance as stated: {}",
    "designators": "a part with two unlike designators; the first counts: {}",
    "namesakes": "one designator on parts that nothing shows to be sections of one package; they are numbered behind it: {}",
}
"""Every kind of warning of the reading, and its message; the braces take what the first case was."""


class Notes:
    """Collects warnings while a file is read."""

    def __init__(self, places: Places) -> None:
        self._places = places
        self._met: dict[str, tuple[tuple[int, int], str, int]] = {}

    def add(self, kind: str, offset: int, detail: str, *, count: int = 1) -> None:
        """Note one more case of ``kind`` at ``offset``; the earliest in the file is the one that is told."""
        self.add_at(kind, self._places.at(offset), detail, count=count)

    def add_at(self, kind: str, place: tuple[int, int], detail: str, *, count: int = 1) -> None:
        """The same, where the line and column are already known."""
        first, told, so_far = self._met.get(kind, (place, detail, 0))
        if place < first:
            first, told = place, detail
        self._met[kind] = (first, told, so_far + count)

    def warnings(self) -> tuple[Warning, ...]:
        """Return one warning a kind, in the order of the file."""
        told = sorted((place, KINDS[kind].format(detail), count) for kind, (place, detail, count) in self._met.items())
        return tuple(Warning(message, line, column, count) for (line, column), message, count in told)
