"""The piece of a board that a transistor is turned on: where it has to end early, what was not looked at is told."""

from __future__ import annotations

from protlint.board.graph import Board
from protlint.topology.excerpt import MOST, REACH, excerpt
from tests.support.boards import board
from tests.support.desk import limits, reviewed

STAR = 58
"""Arms on one net: fewer than make it count as crowded, more than make a piece end."""


def star(arms: int) -> Board:
    """Return resistors from RTN, each the beginning of a chain that two more resistors branch off at every step."""
    rows = ["npn Q1 OUT B RTN"]
    for arm in range(arms):
        at = [f"N{arm}.{step}" for step in range(4)]
        rows.append(f"resistor A{arm} RTN {at[0]} =1")
        rows += [f"resistor B{arm}.{step} {at[step]} {at[step + 1]} =1" for step in range(3)]
        rows += [f"capacitor C{arm}.{step} {at[step]} {at[step + 1]}" for step in range(3)]
    return board("\n".join(rows))


def test_a_piece_that_ends_early_names_the_crowded_net() -> None:
    whole = star(STAR)
    piece = excerpt(whole, [0])
    assert piece.crowded is not None and whole.net_names[piece.crowded] == "RTN"
    assert len(piece.elements) > MOST


def test_a_piece_that_reaches_as_far_as_it_is_to_does_not() -> None:
    few = star(STAR // 2)
    piece = excerpt(few, [0])
    assert piece.crowded is None
    reached = {few.parts[few.elements[one].parts[0]].id for one in piece.elements}
    assert {f"B0.{step}" for step in range(REACH - 1)} <= reached and f"B0.{REACH - 1}" not in reached


def test_a_piece_that_holds_all_there_is_has_not_ended_early() -> None:
    rows = [f"resistor A{arm} RTN N{arm} =1\ncapacitor C{arm} N{arm} K{arm}" for arm in range(STAR)]
    rows += [f"diode D{arm} N{arm} K{arm}" for arm in range(STAR)]
    piece = excerpt(board("\n".join(["npn Q1 OUT B RTN", *rows])), [0])
    assert len(piece.elements) == 1 + 3 * STAR > MOST
    assert piece.crowded is None


SHUNT_ASTRAY = """
Q1 NPN QPN1 LAMP BASE SNS
Q2 NPN QSN1 BASE RTN TAP
R1 RES 390 CMD BASE
R2 RES 2.2 SNS RTN POWER:2W
R3 RES 100 SNS TAP
C1 CAP 10n TAP CLK
J1 CONN - CMD LAMP
J2 CONN - +12V LAMP
J3 CONN - CLK CLK2
"""
ARM = "R{0}1 RES 1k RTN M{0}\nC{0}2 CAP 10n M{0} K{0}\nR{0}3 RES 1k M{0} K{0}\nR{0}4 RES 1k K{0} W\n"


def test_what_a_search_did_not_look_at_is_said_with_the_key_that_shortens_it() -> None:
    """Base and emitter exchanged on a clocked base, its return unnamed and crowded: no way of turning was to be found."""
    supplies = {"+12V": "12 V"}
    crowded = SHUNT_ASTRAY + "".join(ARM.format(arm) for arm in range(10, 10 + STAR))
    (one,) = reviewed(crowded, limits(supply=supplies)).not_checked
    assert one.check == "whether a limiter drawn wrong is at Q2"
    assert one.needs == f"[supply] RTN, if that is one: a search ends at {MOST} parts"
    assert reviewed(crowded, limits(supply={**supplies, "RTN": "0 V"})).not_checked == ()
    assert reviewed(SHUNT_ASTRAY + ARM.format(10), limits(supply=supplies)).not_checked == ()
