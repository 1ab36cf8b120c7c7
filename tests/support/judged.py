"""Sound boards to be spoiled one figure at a time, with their limits; and what tests change on them. All invented."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from protlint.netlist.model import DuplicateDesignator, PinOnTwoNets
from protlint.pipeline import Review
from tests.support.desk import Tables, limits, part_data, reviewed

SINK = """
J1 CONN - CMD LAMP
J2 CONN - +12V GND
R1 RES 390 CMD BASE POWER:0.25W
Q1 NPN QPN1 LAMP BASE SNS
R2 RES 2.2 SNS GND POWER:1W
R3 RES 100 SNS STOP POWER:0.125W
Q2 NPN QSN1 BASE STOP GND
C1 CAP 10n BASE STOP
"""

FOLLOWER = """
J1 CONN - OUT GND
J2 CONN - +24V -5V
U1 OPAMP OPX1 OUT=DRV V+=+24V V-=GND
R10 RES 680 DRV BASE POWER:1W VOLTAGE:200V
Q10 NPN QPN1 +24V BASE SNS
R11 RES 1.2 SNS OUT POWER:2W
R12 RES 150 SNS STOP POWER:0.125W
Q11 NPN QSN1 BASE STOP OUT
C11 CAP 10n BASE STOP
"""

SOURCE = """
J1 CONN - OUT GND
J2 CONN - +15V PULL
R20 RES 820 PULL BASE POWER:1W VOLTAGE:200V
Q20 PNP QPP1 OUT BASE SNS
R21 RES 2.2 +15V SNS POWER:1W
R22 RES 150 SNS STOP POWER:0.125W
Q21 PNP QSP1 BASE STOP +15V
C21 CAP 10n BASE STOP
"""

GATED = """
J1 CONN - CMD LAMP
J2 CONN - +24V GND
R40 RES 2k2 CMD GATE POWER:0.25W
Q40 NMOS MPN1 LAMP GATE SNS
R41 RES 1 SNS GND POWER:2W
R42 RES 1k5 SNS STOP POWER:0.125W
Q41 NPN QSN1 GATE STOP GND
C41 CAP 10n GATE STOP
"""

FOLDING = """
J1 CONN - OUT GND
J2 CONN - +20V DRV
R60 RES 390 DRV BASE POWER:2W VOLTAGE:200V
Q60 NPN QPN1 +20V BASE SNS
R61 RES 1 SNS OUT POWER:5W
R62 RES 180 SNS STOP POWER:0.25W
R63 RES 1k8 STOP GND POWER:0.5W
Q61 NPN QSN1 BASE STOP OUT
C61 CAP 10n BASE STOP
"""

FIXED = {"+12V": "12 V 5 %", "+24V": "24 V 5 %", "+15V": "15 V 5 %", "+20V": "20 V 5 %", "-5V": "-5 V", "GND": "0 V"}


@dataclass(frozen=True)
class Job:
    """A board with its limits and part data, to be changed and reviewed."""

    board: str
    tables: Tables
    data: Tables = field(default_factory=part_data)
    listed: str | None = None
    twice: tuple[PinOnTwoNets, ...] = ()
    alike: tuple[DuplicateDesignator, ...] = ()

    def review(self) -> Review:
        return reviewed(self.board, self.tables, self.data, listed=self.listed, twice=self.twice, alike=self.alike)

    def drawn(self, *changes: tuple[str, str]) -> Job:
        """Return the job with texts of its board replaced, each of which has to be there."""
        board = self.board
        for old, new in changes:
            assert old in board, old
            board = board.replace(old, new)
        return replace(self, board=board)

    def stated(self, **needs: Any) -> Job:
        """Return the job with keys of its limiter's table set; None takes one out."""
        return self._limits("limiter", "*", needs)

    def limited(self, table: str, name: str, **keys: Any) -> Job:
        """Return the job with keys of another limits table set."""
        return self._limits(table, name, keys)

    def supplied(self, **volts: str) -> Job:
        """Return the job with supplies stated otherwise; without any, every supply stated without its range."""
        stated = self.tables["supply"]
        plain = {name: " ".join(text.split()[:2]) for name, text in stated.items()}
        return replace(self, tables={**self.tables, "supply": {**stated, **volts} if volts else plain})

    def board_of(self, **keys: Any) -> Job:
        """Return the job with keys of ``[board]`` set."""
        tables = {**self.tables, "board": {**self.tables["board"], **keys}}
        return replace(self, tables=tables)

    def _limits(self, table: str, name: str, keys: Mapping[str, Any]) -> Job:
        inner = {**self.tables.get(table, {}).get(name, {}), **keys}
        inner = {key: value for key, value in inner.items() if value is not None}
        return replace(self, tables={**self.tables, table: {**self.tables.get(table, {}), name: inner}})

    def rated(self, part_number: str, **ratings: Any) -> Job:
        """Return the job with ratings of a part type set; None takes one out."""
        entry = self.data[part_number]
        changed = {key: value for key, value in {**entry["ratings"], **ratings}.items() if value is not None}
        return self.knowing(part_number, ratings=changed)

    def knowing(self, part_number: str, **tables: Any) -> Job:
        """Return the job with whole tables of a part type set; None takes one out."""
        entry = {**self.data.get(part_number, {}), **tables}
        data = {**self.data, part_number: {key: value for key, value in entry.items() if value is not None}}
        return replace(self, data=data)


def sink() -> Job:
    """A low-side lamp driver: 12 V, 0.2 A needed, a stiff 5 V command."""
    needs = {"carry": "0.2 A", "cap": "0.5 A", "output": "2 V", "shorted_to": ["+12V"], "sink": "8 K/W"}
    return Job(SINK, limits(supply=FIXED, drive={"CMD": {"low": "0 V", "high": "5 V"}}, limiter={"*": needs}))


def follower() -> Job:
    """A series pass stage: 24 V in, 12 V out at 0.3 A, driven by an op-amp."""
    needs = {"carry": "0.3 A", "cap": "0.8 A", "output": "12 V", "sink": "2 K/W", "load_capacitance": "1 uF"}
    drivers = {"OPX1": {"from_rails": "1.5 V", "current": "40 mA", "power": "1 W"}}
    return Job(FOLLOWER, limits(supply=FIXED, driver=drivers, limiter={"*": needs}))


def source() -> Job:
    """A high-side switch with a PNP pass device: 15 V, 0.15 A needed, pulled on to 0 V."""
    needs = {"carry": "0.15 A", "cap": "0.5 A", "output": "13 V", "sink": "4 K/W", "load_capacitance": "1 uF"}
    return Job(SOURCE, limits(supply=FIXED, drive={"PULL": {"low": "0 V", "high": "15 V"}}, limiter={"*": needs}))


def gated() -> Job:
    """A low-side lamp driver with a MOSFET: 24 V, 0.3 A needed, a stiff 10 V command."""
    needs = {"carry": "0.3 A", "cap": "1 A", "output": "2 V", "shorted_to": ["+24V"], "sink": "2 K/W"}
    return Job(GATED, limits(supply=FIXED, drive={"CMD": {"low": "0 V", "high": "10 V"}}, limiter={"*": needs}))


def folding() -> Job:
    """A series pass stage that folds back: 20 V in, 10 V out at 0.8 A, about 0.8 A into a short."""
    needs = {
        "carry": "0.8 A", "cap": "2.2 A", "output": "10 V", "sink": "0.5 K/W", "load": "14 ohm", "load_capacitance": "1 uF",
    }  # fmt: skip
    drive = {"DRV": {"low": "0 V", "high": "20 V", "current": "60 mA"}}
    return Job(FOLDING, limits(supply=FIXED, drive=drive, limiter={"*": needs}))


SOUND: Mapping[str, Callable[[], Job]] = {
    "sink": sink, "follower": follower, "source": source, "gated": gated, "folding": folding,
}  # fmt: skip
"""Boards that have nothing wrong with them."""
