"""Reviews of boards drawn in a few lines, with limits and part data given as plain tables: the whole road but the EDIF.

A board is one part a line: ``designator cell value-or-type net net ... [PROPERTY:text]``, the nets in the order of the
cell's pins (C B E, D G S, A K, 1 2); of other cells each pin is written ``name=net``. ``-`` stands for no value, ``#``
begins a remark. Limits and part data are the tables of their TOML files. Everything is invented.
"""

from __future__ import annotations

import copy
import json
import tempfile
from collections.abc import Mapping
from dataclasses import replace
from functools import cache, lru_cache
from pathlib import Path
from typing import Any

from protlint.board.parts_list import read_parts_list
from protlint.checks.case import Case
from protlint.checks.catalogue import load_catalogue
from protlint.findings import Finding
from protlint.limits_file import load_limits
from protlint.netlist.model import DuplicateDesignator, Net, Netlist, Part, Pin, PinOnTwoNets, Property
from protlint.partdata.book import load_book
from protlint.pipeline import Desk, Review, ReviewedLimiter, review_netlist
from protlint.toml.text import toml_key, toml_string
from protlint.topology.language import load_rules
from tests.support.paths import FIXTURES

PINS = {
    "NPN": "CBE", "PNP": "CBE", "NMOS": "DGS", "PMOS": "DGS", "DIODE": "AK", "ZENER": "AK",
    "RES": "12", "CAP": "12", "IND": "12", "FUSE": "12", "CONN": "12",
}  # fmt: skip
MODELS = json.loads((FIXTURES / "bench-circuits.json").read_text())["models_at_27_degC"]
Tables = dict[str, Any]

_SMALL = {
    "vceo": "45 V", "vebo": "6 V", "ic": "200 mA", "ib": "40 mA", "power": "0.5 W", "rth_ja": "250 K/W",
    "tj_max": "150 degC",
}  # fmt: skip
_POWER = {
    "vceo": "80 V", "vebo": "6 V", "ic": "8 A", "ib": "2 A", "power_case": "62.5 W", "rth_jc": "2 K/W", "rth_ja": "62.5 K/W",
    "tj_max": "150 degC",
}  # fmt: skip
_AREA = [{"lasts": "dc", "points": [["1 V", "8 A"], ["7.8 V", "8 A"], ["40 V", "1.56 A"], ["80 V", "0.4 A"]]}]


def part_data() -> Tables:
    """Return complete part data of the solved bench circuits' invented types, each table free to be changed."""
    ratings = {
        "QSN1": {**_SMALL, "hfe_min": 100, "hfe_max": 300},
        "QSP1": {**_SMALL, "hfe_min": 90, "hfe_max": 280},
        "QPN1": {**_POWER, "hfe_min": 60, "hfe_max": 180},
        "QPP1": {**_POWER, "hfe_min": 50, "hfe_max": 150},
        "QDN1": {**_POWER, "ic": "1.5 A", "ib": "0.3 A", "hfe_min": 70, "hfe_max": 250, "rth_jc": "10 K/W",
                 "rth_ja": "100 K/W", "power_case": "12.5 W"},
        "MPN1": {"vds": "100 V", "vgs": "20 V", "id": "20 A", "power_case": "100 W", "rth_jc": "1.25 K/W",
                 "rth_ja": "62 K/W", "tj_max": "150 degC", "rds_on": "0.05 ohm"},
    }  # fmt: skip
    data: Tables = {}
    for name, one in ratings.items():
        model = {key: value for key, value in MODELS[name].items() if key != "kind"}
        data[name] = {"kind": MODELS[name]["kind"], "source": "invented data sheet", "ratings": one, "model": model}
        if name.startswith(("QP", "QD", "M")):
            data[name]["safe_area"] = copy.deepcopy(_AREA)
    return copy.deepcopy(data)


def limits(**tables: Any) -> Tables:
    """Return limits that leave nothing to be assumed, with more tables: ``supply``, ``drive``, ``limiter`` ..."""
    board = {"ambient": ["-10 degC", "27 degC", "70 degC"], "resistor_tolerance": "1 %", "vbe_spread": "30 mV"}
    return {"board": {**board, **tables.pop("board", {})}, **tables}


def drawn(board: str) -> Netlist:
    """Return the netlist of a board's lines."""
    numbers: dict[str, int] = {}
    parts = []
    for line, row in enumerate((text.split("#")[0].split() for text in board.splitlines()), 1):
        if not row:
            continue
        designator, cell, value, *rest = row
        pins, properties = [], {}
        for text in rest:
            if ":" in text:
                name, _, said = text.partition(":")
                properties[name.casefold()] = Property(name, said, "instance", line, 1)
                continue
            name, _, net = text.rpartition("=")
            pin = name or PINS[cell][len(pins)]
            pins.append(Pin(pin, None, numbers.setdefault(net, len(numbers))))
        key = "VALUE" if cell in ("RES", "CAP", "IND") else "PART_NUMBER"
        if value != "-":
            properties[key.casefold()] = Property(key, value, "instance", line, 1)
        parts.append(Part(designator, designator, cell, "LIB", properties, tuple(pins), line, 1))
    nets = tuple(
        Net(
            name,
            tuple((a, b) for a, part in enumerate(parts) for b, pin in enumerate(part.pins) if pin.net == number),
            1,
            1,
        )
        for name, number in numbers.items()
    )
    return Netlist("drawn.edf", "0" * 64, "DRAWN", tuple(parts), nets)


def reviewed(
    board: str,
    tables: Mapping[str, Any] | None = None,
    data: Mapping[str, Any] | None = None,
    *,
    listed: str | None = None,
    twice: tuple[PinOnTwoNets, ...] = (),
    alike: tuple[DuplicateDesignator, ...] = (),
) -> Review:
    """Return the review of a board; ``listed`` is a parts list, ``twice`` pins that the file joins to two nets, ``alike``
    designators that it gives to several parts.

    Equal ones are reviewed once.
    """
    limits_text = None if tables is None else toml(tables)
    return _reviewed(board, limits_text, toml(part_data() if data is None else data), listed, twice, alike)


@lru_cache(maxsize=512)
def _reviewed(
    board: str,
    limits_text: str | None,
    parts: str,
    listed: str | None,
    twice: tuple[PinOnTwoNets, ...],
    alike: tuple[DuplicateDesignator, ...],
) -> Review:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        known = {name: row.thresholds.keys() for name, row in catalogue().items()}
        limits_file = None if limits_text is None else _written(folder / "limits.toml", limits_text)
        desk = Desk(
            limits=load_limits(limits_file, known_checks=known),
            book=load_book([_written(folder / "parts.toml", parts)]),
            rules=rules(),
            catalogue=catalogue(),
            parts_list=None if listed is None else read_parts_list(_written(folder / "parts.csv", listed)),
        )
    return review_netlist(replace(drawn(board), pins_on_two_nets=twice, duplicate_designators=alike), desk)


rules, catalogue = cache(load_rules), cache(load_catalogue)


def the_one(review: Review) -> ReviewedLimiter:
    """Return the only limiter of a review."""
    (one,) = review.limiters
    return one


def case_of(review: Review) -> Case:
    """Return the case of a review's only limiter, as its checks were given it."""
    one = the_one(review)
    return Case(review.board, one.limiter, one.bench, one.solution, one.needs, review.limits, catalogue())


def found(review: Review, check: str | None = None) -> list[Finding]:
    """Return the findings of a check; without one every finding above a note."""
    if check is None:
        return [finding for finding in review.findings if finding.level != "note"]
    return [finding for finding in review.findings if finding.check == check]


def unchecked(review: Review) -> set[tuple[str, str]]:
    """Return (check, what it needs) of everything that was not checked."""
    return {(one.check, one.needs) for limiter in review.limiters for one in limiter.not_checked}


def toml(tables: Mapping[str, Any], path: tuple[str, ...] = ()) -> str:
    """Return nested tables as TOML."""
    plain, inner = [], []
    for key, value in tables.items():
        if isinstance(value, Mapping):
            inner.append((key, value))
        elif isinstance(value, list) and value and isinstance(value[0], Mapping):
            name = ".".join(map(toml_key, (*path, key)))
            inner += [(f"[[{name}]]\n" + toml(row), None) for row in value]
        else:
            plain.append(f"{toml_key(key)} = {_value(value)}")
    text = "\n".join(plain) + "\n"
    for key, value in inner:
        if value is None:
            text += key
        else:
            name = ".".join(map(toml_key, (*path, key)))
            text += f"[{name}]\n" + toml(value, (*path, key))
    return text


def _value(value: object) -> str:
    if isinstance(value, str):
        return toml_string(value)
    if isinstance(value, list):
        return "[" + ", ".join(map(_value, value)) + "]"
    return repr(value)


def _written(path: Path, text: str) -> Path:
    path.write_text(text, encoding="utf-8")
    return path
