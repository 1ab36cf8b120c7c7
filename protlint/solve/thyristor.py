"""A thyristor as the two transistors it is made of, from its data-sheet figures.

An NPN (cathode, gate, the inner n layer) and a PNP (the gate's p layer, the inner n layer, anode), each with its base at the
other's collector, and the resistance from gate to cathode that the maker builds in. Where the PNP gives the gate back more
than gate resistance and NPN take of it, the pair fires.

With the gate's resistance R_G, what keeps the gate at v is v / R_G - k I_S exp(v / V_T), k = b_p - 1/b_n for the current
gains b_n and b_p: greatest at v = V_GT, where I_GT = (V_GT - V_T) / R_G and the NPN carries V_T / (k R_G). So R_G and I_S
follow from I_GT and V_GT. On, the pair stays so down to an anode current of I_H = (V_GT / R_G) / (a_p - (1 - a_p) / b_n)
(1/R_G with what lies beside it outside), which gives the PNP's a_p = b_p / (1 + b_p).

References: J. J. Ebers, "Four-terminal p-n-p-n transistors", Proceedings of the IRE 40, 1952; J. L. Moll, M. Tanenbaum,
J. M. Goldey and N. Holonyak, "P-n-p-n transistor switches", Proceedings of the IRE 44, 1956: the pair, and that it fires
where the sum of its alphas reaches one. The formulas above are worked out from it here.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from protlint.solve.constants import BOLTZMANN_V_PER_K
from protlint.solve.derive import DATA_SHEET_K, saturation_current

NEEDED = ("igt", "vgt", "ih")
"""Ratings without which there is no model."""

ANODE = " anode"
"""Behind a thyristor's name: its inner PNP."""

BETA_NPN = 20.0
LEAST_ALPHA, GREATEST_ALPHA = 0.1, 0.8
GATE_PER_K = 4.5e-3
"""How the resistance from gate to cathode rises, so that the trigger current halves by 125 degC; common to makers' curves,
from memory."""
WIDEST = 0.95
"""The most that the trigger current's spread may move the gate's resistance."""


@dataclass(frozen=True, slots=True)
class Pair:
    """Both transistors' model parameters, the resistance from gate to cathode [ohm] with its temperature coefficient [1/K]
    and spread (a fraction), how far the gate's voltage may lie above usual [V] where the part says so, and in plain words
    what was derived and what assumed."""

    npn: Mapping[str, float]
    pnp: Mapping[str, float]
    gate_ohm: float
    gate_per_K: float
    gate_spread: float
    above_V: float | None
    derived: tuple[str, ...]
    assumed: tuple[str, ...]


def two_transistors(ratings: Mapping[str, float]) -> Pair:
    """Return the pair of a thyristor whose ratings (SI) hold all of :data:`NEEDED`; ``igt_max``, ``vgt_max``, ``rgk``,
    ``vtm`` and ``vtm_at`` where known.

    Examples
    --------
    The pair of a thyristor of 200 uA at 0.7 V, with what keeps it on twenty times that:

    >>> pair = two_transistors({"igt": 2e-4, "vgt": 0.7, "ih": 4e-3, "igt_max": 4e-4})
    >>> round(pair.gate_ohm), round(pair.pnp["BF"], 3), pair.gate_spread
    (3372, 0.111, 0.5)
    """
    I_GT, V_GT, I_H = (ratings[name] for name in NEEDED)
    V_T = BOLTZMANN_V_PER_K * DATA_SHEET_K
    R_G = (V_GT - V_T) / I_GT
    outside_S = 1.0 / ratings["rgk"] if "rgk" in ratings else 0.0
    alpha = (V_GT * (1.0 / R_G + outside_S) / I_H + 1.0 / BETA_NPN) / (1.0 + 1.0 / BETA_NPN)
    alpha = min(max(alpha, LEAST_ALPHA), GREATEST_ALPHA)
    beta = alpha / (1.0 - alpha)
    I_S = saturation_current(V_T / ((beta - 1.0 / BETA_NPN) * R_G), V_GT)
    derived = [
        f"a gate resistance of {R_G:.3g} ohm and I_S from I_GT {I_GT:g} A at V_GT {V_GT:g} V",
        f"the inner PNP's gain of {beta:.2g} from I_H {I_H:g} A",
        f"the inner NPN's gain of {BETA_NPN:g} and {GATE_PER_K * 100:g} % a kelvin of that resistance, usual for its kind",
    ]
    assumed: list[str] = []
    spread = 0.5
    if "igt_max" in ratings:
        spread = min(max(1.0 - I_GT / ratings["igt_max"], 0.0), WIDEST)
    else:
        assumed.append(f"a trigger current of {I_GT / 1.5:.2g} A to {I_GT / 0.5:.2g} A")
    pnp = {"IS": I_S, "BF": beta}
    if {"vtm", "vtm_at"} <= ratings.keys():
        I_T = ratings["vtm_at"]
        pnp["RE"] = max(ratings["vtm"] - V_T * math.log(I_T / I_S), 0.0) / I_T
        derived.append(f"{pnp['RE']:.2g} ohm in the anode from V_TM {ratings['vtm']:g} V at {I_T:g} A")
    above_V = ratings["vgt_max"] - V_GT if "vgt_max" in ratings else None
    return Pair({"IS": I_S, "BF": BETA_NPN}, pnp, R_G, GATE_PER_K, spread, above_V, tuple(derived), tuple(assumed))
