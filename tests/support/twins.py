"""Netlists as plain dicts, to compare with the twins beside the fixtures."""

from __future__ import annotations

from typing import Any

from protlint.netlist.model import Netlist


def pin_name(netlist: Netlist, part: int, pin: int) -> str:
    return f"{netlist.parts[part].id}.{netlist.parts[part].pins[pin].name}"


def plain_nets(netlist: Netlist) -> dict[str, list[str]]:
    return {net.name: sorted(pin_name(netlist, *pin) for pin in net.pins) for net in netlist.nets}


def plain_pins(netlist: Netlist, part: int) -> list[list[Any]]:
    return [[pin.name, pin.number, netlist.nets[pin.net].name] for pin in netlist.parts[part].pins]


def connections(netlist: Netlist) -> set[frozenset[str]]:
    """The nets with pins as sets of pins, whatever they are called."""
    return {frozenset(pin_name(netlist, *pin) for pin in net.pins) for net in netlist.nets if net.pins}
