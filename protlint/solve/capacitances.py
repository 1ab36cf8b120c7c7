"""Capacitances and transit times where part data gives only data-sheet figures of them.

What a model states stays as it is; what it leaves out comes from the ratings:

- C_JC from C_ob and C_JE from C_ib, measured at a reverse voltage, by the depletion law: C (1 + V / V_J)^M;
- T_F from the transition frequency at a collector current: f_T = g_m / (2 pi (C_pi + C_mu)) with g_m = I / V_T, so
  T_F = 1 / (2 pi f_T) - (C_JE' + C_ob) V_T / I (P. R. Gray and R. G. Meyer, "Analysis and Design of Analog Integrated
  Circuits", chapter on models; from memory), with C_JE' the forward-biased emitter junction's;
- C_GD from C_rss, C_GS from C_iss - C_rss, and the body's from C_oss - C_rss;
- a diode's C_JO from its stated capacitance.

An emitter junction that nobody states is taken by its usual size beside the collector's, a diode's capacitance as usual for
its kind; both are said to be assumed.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from protlint.solve.constants import BOLTZMANN_V_PER_K, T0_K

V_J, M = 0.75, 0.33
"""Published defaults of a bipolar's junctions."""
FORWARD = 1.7
"""A forward-biased emitter junction's depletion capacitance by that at no bias, with V_J and M at their defaults, FC 0.5."""
EMITTER_BY_COLLECTOR = 2.5
"""Usual size of C_JE by C_JC of discrete transistors; common practice of the trade, from memory."""
DIODE_F = {"diode": 4e-12, "zener": 100e-12}
"""Usual capacitance at no bias of a small diode and of a zener; common practice of the trade, from memory."""
LEAST_SHARE = 0.3
"""At least this share of 1 / (2 pi f_T) is transit time, whatever the current f_T is stated at."""


@dataclass(frozen=True, slots=True)
class Charged:
    """Parameters a model leaves out, and in plain words which were derived and which assumed."""

    model: Mapping[str, float]
    derived: tuple[str, ...] = ()
    assumed: tuple[str, ...] = ()


def capacitances_from(kind: str, ratings: Mapping[str, float], model: Mapping[str, float]) -> Charged:
    """Return the dynamic parameters that a part's ratings give and its model leaves out.

    ``kind`` is npn, pnp, nmos, pmos, diode or zener; ``ratings`` are SI values by the names of part data. Empty where the
    ratings say nothing and nothing is usual.
    """
    if kind in ("npn", "pnp"):
        return _bipolar(ratings, model)
    if kind in ("nmos", "pmos"):
        return _mosfet(ratings, model)
    if "CJO" in model:
        return Charged({})
    if "cj" in ratings:
        return Charged({"CJO": ratings["cj"]}, ("C_JO from its stated capacitance",))
    usual_F = DIODE_F[kind]
    return Charged({"CJO": usual_F}, assumed=(f"C_JO as {usual_F * 1e12:g} pF, usual for its kind",))


def _bipolar(ratings: Mapping[str, float], model: Mapping[str, float]) -> Charged:
    made: dict[str, float] = {}
    derived: list[str] = []
    assumed: list[str] = []
    for name, rating, potential, grading, words in (
        ("CJC", "cob", "VJC", "MJC", "C_JC from C_ob"),
        ("CJE", "cib", "VJE", "MJE", "C_JE from C_ib"),
    ):
        if name not in model and rating in ratings:
            reverse_V = ratings.get(f"{rating}_at", 0.0)
            made[name] = ratings[rating] * (1.0 + reverse_V / model.get(potential, V_J)) ** model.get(grading, M)
            derived.append(words)
    collector_F = model.get("CJC", made.get("CJC"))
    if "CJE" not in model and "CJE" not in made and collector_F is not None:
        made["CJE"] = EMITTER_BY_COLLECTOR * collector_F
        assumed.append(f"C_JE as {EMITTER_BY_COLLECTOR:g} times C_JC, usual for its kind")
    if "TF" not in model and "ft" in ratings:
        emitter_F = model.get("CJE", made.get("CJE", 0.0))
        made["TF"] = transit_time(ratings["ft"], ratings.get("ft_at"), FORWARD * emitter_F + (collector_F or 0.0))
        derived.append("T_F from f_T")
    return Charged(made, tuple(derived), tuple(assumed))


def transit_time(f_T: float, I_C: float | None, C: float) -> float:
    """Return the transit time T_F (s) of a transistor with a transition frequency f_T (Hz) at I_C (A).

    1 / (2 pi f_T) - C V_T / I_C at 27 degC, with C (F) the depletion capacitances at the base; where no current is stated,
    or little would be left, at least 0.3 of the whole.

    Examples
    --------
    300 MHz at 10 mA with 12 pF at the base:

    >>> f"{transit_time(300e6, 10e-3, 12e-12):.3g}"
    '4.99e-10'
    """
    whole = 1.0 / (2.0 * math.pi * f_T)
    if I_C is None:
        return whole
    return max(whole - C * BOLTZMANN_V_PER_K * T0_K / I_C, LEAST_SHARE * whole)


def _mosfet(ratings: Mapping[str, float], model: Mapping[str, float]) -> Charged:
    made: dict[str, float] = {}
    derived: list[str] = []
    reverse_F = ratings.get("crss")
    if reverse_F is not None and not {"CGD", "CGDO"} & model.keys():
        made["CGD"] = reverse_F
        derived.append("C_GD from C_rss")
    if "ciss" in ratings and reverse_F is not None and not {"CGS", "CGSO"} & model.keys():
        made["CGS"] = max(ratings["ciss"] - reverse_F, 0.0)
        derived.append("C_GS from C_iss and C_rss")
    if "coss" in ratings and reverse_F is not None and "CBD" not in model:
        made["CBD"] = max(ratings["coss"] - reverse_F, 0.0)
        derived.append("the body's capacitance from C_oss and C_rss")
    return Charged(made, tuple(derived))
