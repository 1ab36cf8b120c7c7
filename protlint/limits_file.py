"""A limits file read, table by table; every quantity is an SI float (temperatures in degC) from here on."""

from __future__ import annotations

import math
from collections.abc import Collection, Iterable, Mapping
from pathlib import Path
from typing import Any

from protlint.findings import LEVELS
from protlint.limits import ATTRIBUTES, UNSTATED, CheckSetting, DriveLimits, LimiterLimits, Limits, Peak, Range
from protlint.toml.file import load_toml
from protlint.toml.tables import Span, Table, nearest

DERATINGS = ("none", "ECSS-Q-ST-30-11C", "EEE-INST-002")
"""No derating, or the figures of a public standard."""

PIN_ROLES = (
    "collector", "base", "emitter", "drain", "gate", "source", "anode", "cathode", "1", "2", "none",
)  # fmt: skip
"""What a pin can be, in ``[pins]`` and in part data; ``base.2`` is the base of the second device in one package."""


def load_limits(path: str | Path | None, *, known_checks: Mapping[str, Collection[str]] | None = None) -> Limits:
    """Return the limits a file states, or the defaults for None.

    ``known_checks`` maps the checks there are to the names of their thresholds; where it is given, others are refused.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : not TOML, an unknown key, a wrong unit or a contradiction, with file, line and column.
    """
    if path is None:
        return Limits(assumed=_assumed({}))
    root = Table.whole(load_toml(path))
    root.only(("board", "supply", "drive", "driver", "limiter", "attributes", "checks", "pins"), called="table")
    checks = known_checks
    return Limits(
        file=root.document.file,
        **_board(root.table("board")),
        supplies_V={name: _range(span) for name, span in _spans(root.table("supply"))},
        drives={name: _drive(table) for name, table in _each(root, "drive")},
        drivers={name: _drive(table) for name, table in _each(root, "driver")},
        limiters={name: _limiter(table, checks) for name, table in _each(root, "limiter")},
        attributes=_attributes(root.table("attributes")),
        checks=_checks(root.table("checks"), checks),
        pins={name: pin_roles(table) for name, table in _each(root, "pins")},
    )


def pin_roles(table: Table) -> dict[str, str]:
    """Return a table of pin names or numbers to roles, checked.

    Raises
    ------
    InputError : a role that is none of :data:`PIN_ROLES`.
    """
    roles = {}
    for pin in table:
        role = table.text(pin) or ""
        name, _, section = role.partition(".")
        if name not in PIN_ROLES or not (section.isdecimal() or "." not in role):
            raise table.error(f'"{role}" is no pin role: {", ".join(PIN_ROLES)}{nearest(role, PIN_ROLES)}', pin)
        roles[pin] = role
    return roles


def _range(span: Span) -> Range:
    return Range(*span)


def _each(root: Table, key: str) -> Iterable[tuple[str, Table]]:
    outer = root.table(key)
    for name in outer or ():
        assert outer is not None
        inner = outer.table(name)
        assert inner is not None
        yield name, inner


def _spans(table: Table | None) -> Iterable[tuple[str, Span]]:
    for name in table or ():
        assert table is not None
        span = table.span(name, "voltage")
        assert span is not None
        yield name, span


def _assumed(stated: Mapping[str, object]) -> tuple[str, ...]:
    return tuple(sentence for key, sentence in UNSTATED.items() if key not in stated)


def _board(table: Table | None) -> dict[str, Any]:
    stated: dict[str, Any] = {}
    if table is not None:
        table.only(("ambient", "resistor_tolerance", "vbe_spread", "derating"))
        if "ambient" in table:
            low, usual, high = table.quantities("ambient", "temperature", "temperature", "temperature")
            if not -273.15 < low <= usual <= high:
                raise table.error('"ambient" is a low, a usual and a high temperature, rising', "ambient")
            stated["ambient_degC"] = (low, usual, high)
        if "resistor_tolerance" in table:
            stated["resistor_tolerance"] = table.quantity("resistor_tolerance", "fraction", least=0.0)
        if "vbe_spread" in table:
            stated["vbe_spread_V"] = _vbe_spread(table)
        if "derating" in table:
            stated["derating"] = table.word("derating", DERATINGS)
    return {**stated, "assumed": _assumed(stated)}


def _vbe_spread(table: Table) -> tuple[float, float]:
    if not isinstance(table.content["vbe_spread"], dict):
        spread = table.quantity("vbe_spread", "voltage", least=0.0) or 0.0
        return spread, spread
    inner = table.table("vbe_spread")
    assert inner is not None
    inner.only(("low", "high"))
    low, high = (inner.quantity(key, "voltage", least=0.0) for key in ("low", "high"))
    if low is None or high is None:
        raise table.error('"vbe_spread" as a table has a low and a high', "vbe_spread")
    return low, high


def _drive(table: Table) -> DriveLimits:
    table.only(("low", "high", "resistance", "current", "power", "from_rails"))
    low, high = table.span("low", "voltage"), table.span("high", "voltage")
    if low is not None and high is not None and low[1] > high[1]:
        raise table.error("the low end of the drive is above its high end", "low")
    return DriveLimits(
        low_V=None if low is None else _range(low),
        high_V=None if high is None else _range(high),
        resistance_ohm=table.quantity("resistance", "resistance", least=0.0) or 0.0,
        current_A=table.quantity("current", "current", above=0.0),
        power_W=table.quantity("power", "power", above=0.0),
        from_rails_V=table.quantity("from_rails", "voltage", least=0.0),
    )


_LIMITER_QUANTITIES = {
    "carry": ("carry_A", "current"),
    "cap": ("cap_A", "current"),
    "short": ("short_s", "time"),
    "sink": ("sink_K_per_W", "thermal resistance"),
    "regulate": ("regulate_A", "current"),
    "load": ("load_ohm", "resistance"),
    "load_current": ("load_current_A", "current"),
    "load_cold": ("load_cold_ohm", "resistance"),
    "load_capacitance": ("load_capacitance_F", "capacitance"),
}
"""Keys of a limiter's table that are above zero, with their field and dimension."""


def _limiter(table: Table, known_checks: Mapping[str, Collection[str]] | None) -> LimiterLimits:
    table.only((*_LIMITER_QUANTITIES, "output", "shorted_to", "shunt_rise", "pass_rise", "peak", "checks"))
    quantities: dict[str, Any] = {
        field_name: table.quantity(key, dimension, above=0.0) for key, (field_name, dimension) in _LIMITER_QUANTITIES.items()
    }
    carry, cap = quantities["carry_A"], quantities["cap_A"]
    if carry is not None and cap is not None and cap < carry:
        raise table.error("cap is below carry: no limiter can meet both", "cap")
    return LimiterLimits(
        **quantities,
        output_V=table.quantity("output", "voltage"),
        shorted_to=table.texts("shorted_to"),
        shunt_rise_K=table.quantity("shunt_rise", "temperature rise", least=0.0),
        pass_rise_K=table.quantity("pass_rise", "temperature rise", least=0.0),
        peak=_peak(table.table("peak")),
        checks=_checks(table.table("checks"), known_checks),
    )


def _peak(table: Table | None) -> Peak | None:
    if table is None:
        return None
    table.only(("current", "lasts", "output"))
    current, lasts = table.quantity("current", "current", above=0.0), table.quantity("lasts", "time", above=0.0)
    if current is None or lasts is None or math.isinf(lasts):
        raise table.error("a peak has a current and the time it lasts")
    return Peak(current_A=current, lasts_s=lasts, output_V=table.quantity("output", "voltage"))


def _attributes(table: Table | None) -> dict[str, tuple[str, ...]]:
    if table is None:
        return {}
    table.only(ATTRIBUTES)
    return {key: table.texts(key) for key in table}


def _checks(table: Table | None, known_checks: Mapping[str, Collection[str]] | None) -> dict[str, CheckSetting]:
    settings: dict[str, CheckSetting] = {}
    if table is None:
        return settings
    if known_checks is not None:
        table.only(known_checks, called="check")
    for name in table:
        if not isinstance(table.content[name], dict):
            settings[name] = CheckSetting(level=table.word(name, (*LEVELS, "off")))
            continue
        inner = table.table(name)
        assert inner is not None
        if known_checks is not None:
            inner.only(("level", *known_checks[name]), called="threshold")
        settings[name] = CheckSetting(
            level=inner.word("level", (*LEVELS, "off")),
            thresholds={key: inner.any_quantity(key) for key in inner if key != "level"},
        )
    return settings
