"""A solvable circuit: a limiter with its surroundings, free of any board.

Everything the solver needs and nothing else. The bench makes one from a limiter and its board; tests make one by hand.
Node names are plain strings; ``0`` is not special: ground is a net held at 0 V.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from protlint.limits import Range
from protlint.toml.text import toml_key

FEED = " (feed)"
"""Behind a supply's name: the node of its own that a drive straight from that supply gets."""


@dataclass(frozen=True, slots=True)
class Device:
    """One two- or three-terminal device.

    ``kind`` is npn, pnp, nmos, pmos, diode, zener, resistor, capacitor or inductor (a Darlington part is two devices).
    ``nodes`` are (collector, base, emitter), (drain, gate, source), (anode, cathode) or (1, 2). ``model`` holds published
    parameter names in SI units at 27 degC; a resistor's are R, TC1, TC2 (at 27 degC), a capacitor's C, an inductor's L.
    ``tolerance`` is a resistor's fraction; ``hfe`` the bounds of BF; ``vbe_spread_V`` how far V_BE may lie below and above.
    ``rise_K`` is the device's temperature above ambient. ``assumed`` says in plain words what of this was assumed,
    ``charges_assumed`` what of its charges was, and ``derived`` what came from data-sheet figures.
    ``part_number`` is the part-data entry that a missing parameter would have to be added to, empty where none is known.
    """

    name: str
    kind: str
    nodes: tuple[str, ...]
    model: Mapping[str, float]
    tolerance: float = 0.0
    hfe: tuple[float, float] | None = None
    vbe_spread_V: tuple[float, float] = (0.0, 0.0)
    rise_K: float = 0.0
    assumed: tuple[str, ...] = ()
    part_number: str = ""
    derived: tuple[str, ...] = ()
    charges_assumed: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Drive:
    """What drives the limiter's stage: the node it holds and its two stated ends.

    Which end turns the pass device on hardest is found by solving. ``current_A`` None means stiff. ``low_follows`` and
    ``high_follows`` name the held net that an end moves with: a supply that feeds the drive straight, or one that the drive
    stays a stated way short of. The end is as far from it at every voltage of that supply as at the usual one.
    ``stated_on`` is the net whose ``[drive]`` entry would state it, where that is not the node: of a stage that a supply
    feeds, the limiter's own drive net.
    """

    node: str
    low_V: Range
    high_V: Range
    resistance_ohm: float = 0.0
    current_A: float | None = None
    assumed: bool = False
    low_follows: str | None = None
    high_follows: str | None = None
    stated_on: str | None = None

    @property
    def key(self) -> str:
        """The limits-file table that states this drive."""
        return f"[drive.{toml_key(self.stated_on or self.node)}]"


@dataclass(frozen=True, slots=True)
class Circuit:
    """The circuit of one limiter.

    ``held`` are the nodes at a fixed voltage (supplies); ``shorts`` the nodes of ``held`` a short may tie the output to,
    never empty; ``pass_devices`` and ``shunt`` device names (a diode string has several shunt devices);
    ``output_V`` the working output voltage where stated; ``output_reach_V`` the lowest and highest voltage the output can
    have (the supplies around it); ``ground_leg`` true where the limit depends on the output voltage by design (a preset leg
    to ground or to the far supply); ``output_capacitance_F`` the board's capacitors at the output, together;
    ``output_inductance_H`` the board's greatest inductor that leads on from there, 0 where none does; ``latch`` the
    transistors that hold the shunt on once it has tripped.
    """

    devices: tuple[Device, ...]
    held: Mapping[str, Range]
    drive: Drive
    output: str
    shorts: tuple[str, ...]
    shunt: tuple[str, ...]
    pass_devices: tuple[str, ...]
    sense: tuple[str, ...]
    output_V: float | None = None
    output_reach_V: tuple[float, float] = (0.0, 0.0)
    ground_leg: bool = False
    regulates: bool = False
    assumed: tuple[str, ...] = field(default_factory=tuple)
    output_capacitance_F: float = 0.0
    output_inductance_H: float = 0.0
    latch: tuple[str, ...] = ()
