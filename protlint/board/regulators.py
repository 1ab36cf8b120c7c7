"""Three-terminal regulators on a board: ICs that take their supply from one net and give it on to another."""

from __future__ import annotations

from protlint.board.graph import Board

REGULATOR_PINS = ({"in", "vin", "vi", "input"}, {"out", "vout", "vo", "output"})
"""What the two ends of a three-terminal regulator are called."""


def regulator_across(board: Board, net: int, output: int) -> int | None:
    """Return the IC that takes its supply from a net and gives it on to the output, by board part: a three-terminal
    regulator whose booster the net drives. None where there is none."""
    taking, giving = REGULATOR_PINS
    fed = {index for index, role in board.nets[net].pins if board.parts[index].kind == "ic" and role.casefold() in taking}
    given = (index for index, role in board.nets[output].pins if index in fed and role.casefold() in giving)
    return next(given, None)
