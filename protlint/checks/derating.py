"""Derating by name: the share of a rating that a standard lets a board use.

The tables' figures are from memory and say so in the working; ``none`` leaves every rating whole.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

FAMILY_OF = {
    "npn": "bipolar", "pnp": "bipolar", "npn-darlington": "bipolar", "pnp-darlington": "bipolar",
    "nmos": "mosfet", "pmos": "mosfet", "diode": "diode", "zener": "diode", "resistor": "resistor",
}  # fmt: skip
"""The rows of a derating standard by kind of part."""


@dataclass(frozen=True, slots=True)
class Standard:
    """One standard's shares by (family, quantity), and what it leaves of a junction's temperature.

    The junction may reach the least of ``junction_degC``, ``junction_below_K`` under its rating, and ``junction_share`` of
    its rating in degC.
    """

    source: str
    shares: Mapping[tuple[str, str], float]
    junction_degC: float = float("inf")
    junction_below_K: float = 0.0
    junction_share: float = 1.0


STANDARDS: Mapping[str, Standard] = {
    "none": Standard("", {}),
    "ECSS-Q-ST-30-11C": Standard(
        "ECSS-Q-ST-30-11C; memory",
        {
            ("bipolar", "voltage"): 0.75, ("bipolar", "current"): 0.75, ("bipolar", "power"): 0.65,
            ("mosfet", "voltage"): 0.80, ("mosfet", "current"): 0.75, ("mosfet", "power"): 0.65,
            ("diode", "voltage"): 0.75, ("diode", "current"): 0.75,
            ("resistor", "voltage"): 0.80, ("resistor", "power"): 0.50,
        },
        junction_degC=110.0,
        junction_below_K=40.0,
    ),
    "EEE-INST-002": Standard(
        "NASA EEE-INST-002; memory",
        {
            ("bipolar", "voltage"): 0.75, ("bipolar", "current"): 0.75, ("bipolar", "power"): 0.60,
            ("mosfet", "voltage"): 0.75, ("mosfet", "current"): 0.75, ("mosfet", "power"): 0.60,
            ("diode", "voltage"): 0.70, ("diode", "current"): 0.50,
            ("resistor", "voltage"): 0.80, ("resistor", "power"): 0.60,
        },
        junction_share=0.80,
    ),
}  # fmt: skip
"""Keyed as ``[board] derating`` names them; every figure from memory."""


def share_of(derating: str, kind: str, quantity: str) -> float:
    """Return the share of a rating that may be used; ``quantity`` is ``voltage``, ``current`` or ``power``.

    1 where nothing is derated, and where the standard has no row for the kind.
    """
    return STANDARDS[derating].shares.get((FAMILY_OF.get(kind, ""), quantity), 1.0)


def junction_limit_degC(derating: str, tj_max_degC: float) -> float:
    """Return the junction temperature that may be reached, in degC."""
    standard = STANDARDS[derating]
    return min(
        standard.junction_degC, tj_max_degC - standard.junction_below_K, standard.junction_share * tj_max_degC, tj_max_degC
    )


def derated(derating: str, kind: str, quantity: str, source: str) -> str:
    """Return a rating's source with the standard that lessens it: ``data sheet, times 0.65 (ECSS-Q-ST-30-11C; memory)``."""
    share = share_of(derating, kind, quantity)
    return source if share == 1.0 else f"{source}, times {share:g} ({STANDARDS[derating].source})"


def derating_remarks(derating: str) -> tuple[str, ...]:
    """Return what a report has to say of a standard whatever its verdicts are: where its figures come from."""
    source = STANDARDS[derating].source
    return (
        (f"every rating is derated by figures of {source.replace('; ', ', from ')}: hold them against it",) if source else ()
    )
