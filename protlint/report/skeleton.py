"""The limits file a survey writes: what is known filled in, blanks in comments for what only the designer knows.

It is a valid limits file as it stands, and reading it back gives what was known, so that a survey with it writes it again.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING

from protlint.board.attributes import file_habits
from protlint.board.pins import FAMILY
from protlint.limits import ATTRIBUTES, CheckSetting, DriveLimits, LimiterLimits, Limits, Range
from protlint.limits_file import load_limits
from protlint.report.digest import listed
from protlint.report.safe import readable, terminal
from protlint.report.survey import pins_unknown
from protlint.toml.text import toml_key, toml_string

if TYPE_CHECKING:
    from protlint.pipeline import Review, ReviewedLimiter

LIMITER_KEYS = (
    ("carry", "carry_A", "A", "the current it must deliver"),
    ("cap", "cap_A", "A", "the current that must never be exceeded"),
    ("output", "output_V", "V", "the output voltage it works at"),
    ("short", "short_s", "s", 'how long a short lasts, or "continuous"'),
    ("sink", "sink_K_per_W", "K/W", "heat sink of the pass device, case to ambient"),
    ("load", "load_ohm", "ohm", "what hangs on the output"),
    ("shunt_rise", "shunt_rise_K", "K", "the shunt above ambient when warm"),
)
"""Key, field, unit and meaning of what the skeleton asks of every limiter."""

OTHER_LIMITER_KEYS = (
    ("pass_rise", "pass_rise_K", "K"),
    ("regulate", "regulate_A", "A"),
    ("load_current", "load_current_A", "A"),
    ("load_cold", "load_cold_ohm", "ohm"),
    ("load_capacitance", "load_capacitance_F", "F"),
)
"""Written where they are stated, not asked for."""

DRIVE_KEYS = (
    ("resistance", "resistance_ohm", "ohm", "in series with it"),
    ("current", "current_A", "A", "the most it can give"),
    ("power", "power_W", "W", "the most it can dissipate"),
    ("from_rails", "from_rails_V", "V", "how near its supplies it reaches"),
)

HEADER = """\
# Limits file of {file}, begun by protlint. Lines behind a # wait for what only the designer knows:
# fill in the figure with its unit and take the # away.
"""


def rendered_skeleton(review: Review) -> str:
    """Return the limits file for a reviewed board."""
    limits = review.limits
    blocks = [
        HEADER.format(file=terminal(review.board.netlist.file)).splitlines(),
        _board(limits),
        _supplies(review),
        *_drives(review),
        *_drivers(limits),
        *_limiters(review),
        _attributes(review),
        _checks("checks", limits.checks),
        *_pins(review),
    ]
    return "\n\n".join("\n".join(block) for block in blocks if block) + "\n"


def quantity(value: float, unit: str) -> str:
    """Return a quantity as TOML that reads back as the same number: ``"24 V"``."""
    if math.isinf(value):
        return '"continuous"'
    short = f"{value:.12g}"
    return f'"{short if float(short) == value else repr(float(value))} {unit}"'


def _board(limits: Limits) -> list[str]:
    """Write the board's figures; those that stand at their defaults stay comments, so that they go on being assumed."""
    low, high = limits.vbe_spread_V
    spread = quantity(low, "V") if low == high else f"{{ low = {quantity(low, 'V')}, high = {quantity(high, 'V')} }}"
    ambient = ", ".join(quantity(value, "degC") for value in limits.ambient_degC)
    rows = (
        f"ambient = [{ambient}]  # low, usual, high",
        f"resistor_tolerance = {quantity(round(limits.resistor_tolerance * 100.0, 9), '%')}  # for parts that state none",
        f"vbe_spread = {spread}  # how far V_BE may lie from its usual value",
    )
    assumed = (sentence in limits.assumed for sentence in load_limits(None).assumed)
    return [
        "[board]",
        *(f"# {row}" if guess else row for row, guess in zip(rows, assumed, strict=True)),
        f"derating = {toml_string(limits.derating)}",
    ]


def _supplies(review: Review) -> list[str]:
    known = {net.name: net.supply for net in review.board.nets if net.supply is not None}
    rows = {
        name: f"{'# ' if supply.known_from == 'assumed' else ''}{toml_key(name)} = {_range(supply.voltage_V)}"
        for name, supply in known.items()
    }
    rows |= {name: f'# {toml_key(name)} = " V"' for name, _ in _lacking(review, "supply")}
    rows |= {name: f"{toml_key(name)} = {_range(voltage)}" for name, voltage in review.limits.supplies_V.items()}
    return ["[supply]", *rows.values()]


def _drives(review: Review) -> Iterable[list[str]]:
    """Write the drives that are stated, and a blank for each that was assumed is not known or does not turn its stage on."""
    for name, drive in review.limits.drives.items():
        yield [f"[drive.{toml_key(name)}]", *_drive_rows(drive)]
    asked = dict(_lacking(review, "drive"))
    asked |= {
        item.circuit.drive.stated_on or item.circuit.drive.node: item.limiter.id
        for item in _board_order(review)
        if item.circuit is not None
        and (item.circuit.drive.assumed or item.circuit.drive.key in (item.solution.not_solved or ""))
    }
    for name, limiter in asked.items():
        if name not in review.limits.drives:
            yield [
                f"# [drive.{toml_key(name)}]  # of {terminal(limiter)}",
                '# low = " V"  # the lower end of its swing',
                '# high = " V"  # the upper end',
                *(f'# {key} = " {unit}"  # {meaning}' for key, _, unit, meaning in DRIVE_KEYS[:2]),
            ]


def _lacking(review: Review, subject: str) -> Iterable[tuple[str, str]]:
    """Yield the nets whose supply or drive a limiter is not judged for want of, with the limiter's id."""
    for item in _board_order(review):
        for one in item.bench.missing:
            if one.subject == subject and one.net is not None:
                yield one.net, item.limiter.id


def _drivers(limits: Limits) -> Iterable[list[str]]:
    for name, drive in limits.drivers.items():
        yield [f"[driver.{toml_key(name)}]", *_drive_rows(drive)]


def _drive_rows(drive: DriveLimits) -> list[str]:
    rows = []
    for key, span in (("low", drive.low_V), ("high", drive.high_V)):
        rows += [f"{key} = {_range(span)}"] if span is not None else []
    for key, field_name, unit, _ in DRIVE_KEYS:
        value = getattr(drive, field_name)
        rows += [f"{key} = {quantity(value, unit)}"] if value else []
    return rows


def _limiters(review: Review) -> Iterable[list[str]]:
    """Write the tables that are stated as they are, then one for each limiter that no table of its own speaks of."""
    stated = review.limits.limiters
    parts = {item.limiter.id: item for item in _board_order(review)}
    for name in [*stated, *(name for name in parts if name not in stated)]:
        item, needs = parts.get(name), stated.get(name, LimiterLimits())
        about = f"  # {_about(item)}" if item is not None else ""
        yield [f"[limiter.{toml_key(name)}]{about}", *_limiter_rows(needs, item.needs if item is not None else None)]


def _about(item: ReviewedLimiter) -> str:
    names = [f"{role} {', '.join(item.limiter.roles[role])}" for role in ("sense", "shunt") if item.limiter.roles.get(role)]
    return terminal("; ".join([item.limiter.topology, *names]))


def _limiter_rows(needs: LimiterLimits, known: LimiterLimits | None) -> list[str]:
    """Write what a table states, and of a limiter on the board a blank for what neither it nor another table states."""
    rows = []
    for key, field_name, unit, meaning in LIMITER_KEYS:
        value = getattr(needs, field_name)
        if value is not None:
            rows.append(f"{key} = {quantity(value, unit)}")
        elif known is not None and getattr(known, field_name) is None:
            rows.append(f'# {key} = " {unit}"  # {meaning}')
    for key, field_name, unit in OTHER_LIMITER_KEYS:
        value = getattr(needs, field_name)
        rows += [f"{key} = {quantity(value, unit)}"] if value is not None else []
    if needs.shorted_to:
        rows.append(f"shorted_to = [{', '.join(toml_string(name) for name in needs.shorted_to)}]")
    if needs.peak is not None:
        peak = [f"current = {quantity(needs.peak.current_A, 'A')}", f"lasts = {quantity(needs.peak.lasts_s, 's')}"]
        peak += [f"output = {quantity(needs.peak.output_V, 'V')}"] if needs.peak.output_V is not None else []
        rows.append(f"peak = {{ {', '.join(peak)} }}")
    if needs.checks:
        settings = ", ".join(f"{toml_key(name)} = {_setting(setting)}" for name, setting in needs.checks.items())
        rows.append(f"checks = {{ {settings} }}")
    return rows


def _attributes(review: Review) -> list[str]:
    """Write the property names that are stated, and a blank for what no property tells where the file has others."""
    stated = review.limits.attributes
    rows = [f"{key} = [{', '.join(map(toml_string, names))}]" for key, names in stated.items()]
    habits = file_habits(review.board.netlist, review.limits)
    silent = [key for key in ATTRIBUTES if not habits.found[key] and key not in stated] if habits.others else []
    if silent:
        names = sorted(habits.others, key=lambda name: -habits.others[name])
        rows.append(f"# which of the file's other properties tells it, if any does: {readable(listed(names))}")
        rows += [f'# {key} = [""]' for key in silent]
    return ["[attributes]" if stated else "# [attributes]", *rows] if rows else []


def _checks(title: str, checks: Mapping[str, CheckSetting]) -> list[str]:
    rows = [f"{toml_key(name)} = {_setting(setting)}" for name, setting in checks.items()]
    return [f"[{title}]", *rows] if rows else []


def _setting(setting: CheckSetting) -> str:
    if not setting.thresholds:
        return toml_string(str(setting.level))
    rows = [f"level = {toml_string(str(setting.level))}"] if setting.level is not None else []
    rows += [f"{toml_key(name)} = {float(value)!r}" for name, value in setting.thresholds.items()]
    return f"{{ {', '.join(rows)} }}"


def _pins(review: Review) -> Iterable[list[str]]:
    """Write the pin roles that are stated, a blank for each type whose pins could not be told apart, and for each type of
    a limiter or a fault whose pin order is known from memory only, that order to hold against a data sheet.

    Of diodes, of which a board has many, only those that a limiter, a fault or a finding names are asked about.
    """
    stated = review.limits.pins
    for name, roles in stated.items():
        yield [f"[pins.{toml_key(name)}]", *(f"{toml_key(pin)} = {toml_string(role)}" for pin, role in roles.items())]
    groups = (*review.found.limiters, *(fault.group for fault in review.found.faults))
    named = dict.fromkeys(part for group in groups for parts in group.roles.values() for part in parts)
    asked = {*named, *(part for finding in review.findings for part in finding.parts)}
    lacking: dict[str, list[str]] = {}
    for part in review.board.parts:
        if pins_unknown(part) and part.part.pins and (FAMILY[part.kind] != "diode" or part.id in asked):
            names = [pin.number or pin.name for pin in part.part.pins]
            lacking.setdefault(part.part_number or part.part.cell, names)
    for name, pins in lacking.items():
        if name not in stated:
            yield [f"# [pins.{toml_key(name)}]", *(f'# {toml_key(pin)} = ""' for pin in dict.fromkeys(pins))]
    known = [review.board.part_of[part] for part in named if part in review.board.part_of]
    remembered = {part.part_number: part.entry for part in known if part.pins_from_memory and part.entry is not None}
    for number, entry in remembered.items():
        rows = (f"# {toml_key(pin)} = {toml_string(role)}" for pin, role in entry.pins.items())
        yield [f"# [pins.{toml_key(number or entry.part_number)}]  # as protlint has it from memory", *rows]


def _board_order(review: Review) -> list[ReviewedLimiter]:
    by_id = {item.limiter.id: item for item in review.limiters}
    return [by_id[limiter.id] for limiter in review.found.limiters if limiter.id in by_id]


def _range(span: Range) -> str:
    if span.low == span.usual == span.high:
        return quantity(span.usual, "V")
    ends = ", ".join(f"{key} = {quantity(getattr(span, key), 'V')}" for key in ("low", "usual", "high"))
    return f"{{ {ends} }}"
