"""What a limits file speaks of and the board has not: said, because it may be a slip of the pen."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Iterator

from protlint.board.drives import nets_driven
from protlint.board.graph import Board
from protlint.limits import Limits, fits, is_glob
from protlint.toml.tables import nearest
from protlint.toml.text import toml_key

ON_THIS_BOARD = "on this board"
"""How such a remark ends, but for the nearest name that is there; of several boards it counts only where all make it."""

MOST_NAMES = 2_000
"""Among more, looking for the nearest takes longer than it is worth."""


def idle_tables(limits: Limits, board: Board, spoken_of: Iterable[str]) -> tuple[str, ...]:
    """Return a remark on every table and supply of a limits file that speaks of nothing on the board.

    ``spoken_of`` are the names that limiters go by, and those of parts and nets in findings. A supply may lie elsewhere
    where a short is tied to it, and so may a ground.
    """
    names = tuple(dict.fromkeys(spoken_of))
    return tuple(
        f"{limits.file}: {table.format(toml_key(name))} fits no {what} {ON_THIS_BOARD}{_nearest(name, known)}"
        for table, name, what, known in _idle(limits, board, names)
    )


def _nearest(name: str, known: Collection[str]) -> str:
    return nearest(name, sorted(known)) if len(known) <= MOST_NAMES else ""


def _idle(limits: Limits, board: Board, spoken_of: tuple[str, ...]) -> Iterator[tuple[str, str, str, Collection[str]]]:
    """Yield each idle table, the name in it, what that could be, and the names of such that the board has."""
    nets = {name for net in board.nets for name in net.names}
    folded = {name.casefold() for name in nets}
    elsewhere = {name for needs in limits.limiters.values() for name in needs.shorted_to}
    for name, voltage in limits.supplies_V.items():
        if name.casefold() not in folded and name not in elsewhere and voltage.usual != 0.0:
            yield "[supply] {}", name, "net", nets
    for name in limits.drives:
        if name != "*" and not nets_driven(name, board.parts, board.nets, board.net_of):
            yield "[drive.{}]", name, "net but supplies and no output" if is_glob(name) else "net and no pin", nets
    numbers = {part.part_number for part in board.parts if part.part_number is not None}
    for name in limits.drivers:
        if not any(fits(name, number) for number in numbers):
            yield "[driver.{}]", name, "part number", numbers
    for name in limits.limiters:
        if name != "*" and not any(fits(name, one) for one in spoken_of):
            yield "[limiter.{}]", name, "limiter", spoken_of
    types = numbers | {part.part.cell for part in board.parts}
    for name in limits.pins:
        if not any(fits(name, one) for one in types):
            yield "[pins.{}]", name, "cell and no part number", types
