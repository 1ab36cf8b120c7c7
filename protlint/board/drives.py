"""Which nets a limits file states a drive for, by name or by a pin on them, and which pins drive nothing."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from protlint.board.graph import BoardNet, BoardPart
from protlint.limits import DriveLimits, Limits, fits, is_glob

INPUT_NAMES = frozenset(
    {"+", "-", "+in", "-in", "in", "in+", "in-", "inp", "inn", "fb", "adj", "sense", "vref", "ref", "en"}
)
"""Names of IC pins that take a signal and give none."""


def stated_drives(
    parts: Sequence[BoardPart], nets: Sequence[BoardNet], net_of: Sequence[int], limits: Limits
) -> dict[int, DriveLimits]:
    """Return the table of a limits file for the drive of each net that one speaks of.

    An exact name counts before a glob, else a later table before an earlier one.
    """
    by_glob: dict[int, DriveLimits] = {}
    by_name: dict[int, DriveLimits] = {}
    for key, table in limits.drives.items():
        for net, is_name in nets_driven(key, parts, nets, net_of).items():
            (by_name if is_name else by_glob)[net] = table
    return by_glob | by_name


def nets_driven(key: str, parts: Sequence[BoardPart], nets: Sequence[BoardNet], net_of: Sequence[int]) -> dict[int, bool]:
    """Return the nets that the key of a ``[drive]`` table speaks of, and of each whether by its very name or a pin's.

    A pin goes by its part's id and its number or name, ``U1.6``. A glob speaks of no supply and of no input, so that
    ``U1.*`` are the outputs of U1; without a dot it speaks of no pin. ``*`` speaks of no net of its own: it is for
    drives that nothing else is stated of.
    """
    folded = key.casefold()
    named = {net.index for net in nets if any(name.casefold() == folded for name in net.names)}
    for part in parts if "." in key else ():
        if folded.startswith(f"{part.id}.".casefold()):
            named |= {net_of[pin.net] for pin in part.part.pins if folded in _names_of_pin(part, pin.name, pin.number)}
    if not is_glob(key) or key == "*":
        return dict.fromkeys(sorted(named), True)
    fitting = {net.index for net in nets if any(fits(key, name) for name in net.names)}
    fitting |= {net for part in parts for net in _outputs_fitting(key, part, net_of)} if "." in key else set()
    return {net: net in named for net in sorted(named | {net for net in fitting if nets[net].supply is None})}


def _outputs_fitting(key: str, part: BoardPart, net_of: Sequence[int]) -> Iterator[int]:
    for pin in part.part.pins:
        fitting = any(fits(key, name) for name in _names_of_pin(part, pin.name, pin.number))
        if fitting and not (part.kind == "ic" and is_input(part, pin.name)):
            yield net_of[pin.net]


def _names_of_pin(part: BoardPart, name: str, number: str | None) -> tuple[str, ...]:
    return tuple(f"{part.id}.{label}".casefold() for label in (name, number) if label is not None)


def is_input(part: BoardPart, role: str) -> bool:
    """Tell whether an IC's pin takes a signal and gives none: by its direction where the file gives one, else its name."""
    for pin in part.part.pins:
        if role in (pin.name, pin.number) and pin.direction is not None:
            return pin.direction.casefold() == "input"
    return role.casefold() in INPUT_NAMES
