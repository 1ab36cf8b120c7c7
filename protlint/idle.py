"""What a limits file speaks of and the board has not: said, because it may be a slip of the pen."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from protlint.board.graph import Board
from protlint.limits import Limits, fits
from protlint.toml.text import toml_key

ON_THIS_BOARD = "on this board"
"""How such a remark ends; of several boards it counts only where it is made of all."""


def idle_tables(limits: Limits, board: Board, spoken_of: Iterable[str]) -> tuple[str, ...]:
    """Return a remark on every table and supply of a limits file that speaks of nothing on the board.

    ``spoken_of`` are the names that limiters go by, and those of parts and nets in findings. A supply may lie elsewhere
    where a short is tied to it, and so may a ground.
    """
    names = tuple(dict.fromkeys(spoken_of))
    return tuple(f"{limits.file}: {table} fits no {what} {ON_THIS_BOARD}" for table, what in _idle(limits, board, names))


def _idle(limits: Limits, board: Board, spoken_of: tuple[str, ...]) -> Iterator[tuple[str, str]]:
    nets = {name for net in board.nets for name in net.names}
    folded = {name.casefold() for name in nets}
    elsewhere = {name for needs in limits.limiters.values() for name in needs.shorted_to}
    for name, voltage in limits.supplies_V.items():
        if name.casefold() not in folded and name not in elsewhere and voltage.usual != 0.0:
            yield f"[supply] {toml_key(name)}", "net"
    for name in limits.drives:
        if name not in nets and not board.nets_of_pin(name):
            yield f"[drive.{toml_key(name)}]", "net and no pin"
    numbers = {part.part_number for part in board.parts if part.part_number is not None}
    for name in limits.drivers:
        if name.casefold() not in {number.casefold() for number in numbers}:
            yield f"[driver.{toml_key(name)}]", "part number"
    for name in limits.limiters:
        if name != "*" and not any(fits(name, one) for one in spoken_of):
            yield f"[limiter.{toml_key(name)}]", "limiter"
    types = numbers | {part.part.cell for part in board.parts}
    for name in limits.pins:
        if not any(fits(name, one) for one in types):
            yield f"[pins.{toml_key(name)}]", "cell and no part number"
