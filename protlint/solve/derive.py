"""Model parameters where part data gives only data-sheet figures, or nothing.

``derive`` returns a part's own model where it has one. Else parameters come from its ratings (names as in part data, SI
values): V_BE at a current, hFE, gate threshold, transconductance, on-resistance, zener voltage. What even those do not say
stands at a default of the kind, with a wide spread, and is said to be assumed.

The defaults are common practice of the trade for silicon parts: a transistor drops 0.66 V at a fiftieth of its rated
collector current, a junction diode 0.65 V at a hundredth of its rated current, a power MOSFET starts at 3 V. Data-sheet
figures hold at 25 degC, model parameters at 27 degC; the published temperature laws carry them over.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, replace

from protlint.quantities import format_quantity
from protlint.solve.capacitances import capacitances_from
from protlint.solve.constants import BOLTZMANN_V_PER_K, T0_K

Model = Mapping[str, float]
Pair = tuple[float, float]

DATA_SHEET_K = 298.15
GATE_DRIVE_V = 10.0
"""Gate voltage at which on-resistances of power MOSFETs are stated."""

DEFAULT_IC_A = {"small": 0.1, "power": 4.0}
DEFAULT_V_BE, DEFAULT_V_BE_SHARE, DEFAULT_V_BE_SPREAD = 0.66, 1.0 / 50.0, (0.10, 0.10)
DEFAULT_HFE: Pair = (50.0, 400.0)
DEFAULT_VAF = 100.0
DEFAULT_V_TH, DEFAULT_V_TH_SPREAD = 3.0, (1.0, 1.0)
DEFAULT_LAMBDA = 0.01
DEFAULT_V_F, DEFAULT_I_F, DEFAULT_V_F_SPREAD = 0.65, 1e-2, (0.10, 0.10)
DIODE_N = 1.8
DRIVER_SHARE = 1.0 / 20.0
"""Size of a Darlington part's first transistor by its second."""


@dataclass(frozen=True, slots=True)
class Derived:
    """A model and how it came about.

    ``driver_model`` is the first transistor's of a Darlington part. ``hfe`` bounds B_F (of each of its two transistors);
    ``vbe_spread_V`` how far V_BE (V_GS(th), V_F) may lie below and above, None where nothing widens the stated spread.
    ``derived`` says in plain words what came from data-sheet figures, or stands at a figure usual for the kind that moves a
    current by little; ``assumed`` what came from nowhere and verdicts rest on;
    ``charges_assumed`` what of its charges did, on which nothing rests but loop and delay.
    """

    model: Model
    driver_model: Model = field(default_factory=dict)
    hfe: Pair | None = None
    vbe_spread_V: Pair | None = None
    derived: tuple[str, ...] = ()
    assumed: tuple[str, ...] = ()
    charges_assumed: tuple[str, ...] = ()


@dataclass(slots=True)
class _Words:
    derived: list[str] = field(default_factory=list)
    usual: list[str] = field(default_factory=list)
    assumed: list[str] = field(default_factory=list)

    def not_assumed(self) -> tuple[str, ...]:
        """Return what was derived, and what stands at a figure usual for the kind and moves a current by little."""
        return (*self.derived, *(f"{sentence}, usual for its kind" for sentence in self.usual))


def derive(kind: str, ratings: Mapping[str, float], model: Model, *, carries_load: bool = False) -> Derived:
    """Return the model of a part of a kind (npn pnp nmos pmos diode zener, or a bipolar with ``-darlington``).

    ``ratings`` are magnitudes in SI units by the names of part data; ``model`` its published parameters, empty where it has
    none. A bipolar of unknown size is taken as a power device where it ``carries_load``.
    """
    base = kind.removesuffix("-darlington")
    if base in ("npn", "pnp"):
        found = _darlington(ratings, model) if base != kind else _bipolar(ratings, model, carries_load)
    elif base in ("nmos", "pmos"):
        found = _mosfet(base, ratings, model)
    else:
        found = _diode(base, ratings, model)
    charged = capacitances_from(base, ratings, found.model)
    driver = {name: value * DRIVER_SHARE if name != "TF" else value for name, value in charged.model.items()}
    return replace(
        found,
        model={**found.model, **charged.model},
        driver_model={**found.driver_model, **driver} if found.driver_model else {},
        derived=found.derived + charged.derived,
        charges_assumed=charged.assumed,
    )


def saturation_current(I: float, V: float, N: float = 1.0, E_G: float = 1.11, X_TI: float = 3.0) -> float:  # noqa: E741
    """Return the saturation current at 27 degC (A) of a junction that carries I (A) at V (V) and 25 degC.

    I_S = I / exp(V / (N V_T)), carried from 25 to 27 degC by the published law (Nagel 1975).

    Examples
    --------
    A BC547 drops 0.66 V at 2 mA (data sheet, typical):

    >>> f"{saturation_current(2e-3, 0.66):.2g}"
    '1.9e-14'
    """
    V_T = BOLTZMANN_V_PER_K * DATA_SHEET_K
    ratio = T0_K / DATA_SHEET_K
    growth = (ratio - 1.0) * E_G / (BOLTZMANN_V_PER_K * T0_K) + X_TI * math.log(ratio)
    return I * math.exp(-V / (N * V_T) + growth / N)


def _bipolar(ratings: Mapping[str, float], model: Model, carries_load: bool = False) -> Derived:
    words = _Words()
    hfe = _hfe(ratings, model, words)
    if model:
        return Derived(model, hfe=hfe, assumed=tuple(words.assumed))
    rated_A = ratings.get("ic")
    if rated_A is None:
        large = carries_load or ratings.get("power", 0.0) > 1.0 or "rth_jc" in ratings
        rated_A = DEFAULT_IC_A["power" if large else "small"]
        words.assumed.append(f"a collector current rating of {format_quantity(rated_A, 'A')}")
    spread: Pair | None = None
    if "vbe" in ratings and "vbe_at" in ratings:
        V_BE, at_A = ratings["vbe"], ratings["vbe_at"]
        words.derived.append(f"I_S from V_BE {V_BE:g} V at {format_quantity(at_A, 'A')}")
    elif {"vbe_min", "vbe_max", "vbe_at"} <= ratings.keys():
        V_BE, at_A = 0.5 * (ratings["vbe_min"] + ratings["vbe_max"]), ratings["vbe_at"]
        spread = (V_BE - ratings["vbe_min"], ratings["vbe_max"] - V_BE)
        words.derived.append(
            f"I_S from V_BE {ratings['vbe_min']:g} V to {ratings['vbe_max']:g} V at {format_quantity(at_A, 'A')}"
        )
    else:
        V_BE, at_A = DEFAULT_V_BE, rated_A * DEFAULT_V_BE_SHARE
        spread = DEFAULT_V_BE_SPREAD
        words.assumed.append(f"V_BE {V_BE:g} V at {format_quantity(at_A, 'A')}, within {spread[0]:g} V")
    words.usual.append(f"an Early voltage of {DEFAULT_VAF:g} V and high injection from {format_quantity(rated_A, 'A')}")
    made = {
        "IS": saturation_current(at_A, V_BE),
        "BF": math.sqrt(hfe[0] * hfe[1]),
        "VAF": DEFAULT_VAF,
        "IKF": rated_A,
        "XTB": 1.5,
    }
    return Derived(made, {}, hfe, spread, words.not_assumed(), tuple(words.assumed))


def _hfe(ratings: Mapping[str, float], model: Model, words: _Words) -> Pair:
    """Return the bounds of B_F: stated, or a factor around what is known, or the default."""
    low, high = ratings.get("hfe_min"), ratings.get("hfe_max")
    if low is not None and high is not None:
        words.derived.append(f"B_F from hFE {low:g} to {high:g}")
        return (low, high)
    if low is not None:
        words.assumed.append(f"an hFE of at most {4.0 * low:g}")
        return (low, 4.0 * low)
    if high is not None:
        words.assumed.append(f"an hFE of at least {high / 4.0:g}")
        return (high / 4.0, high)
    if "BF" in model:
        words.assumed.append(f"an hFE between half and twice the model's {model['BF']:g}")
        return (0.5 * model["BF"], 2.0 * model["BF"])
    words.assumed.append(f"an hFE of {DEFAULT_HFE[0]:g} to {DEFAULT_HFE[1]:g}")
    return DEFAULT_HFE


def _darlington(ratings: Mapping[str, float], model: Model) -> Derived:
    """Return both transistors of a Darlington part: current gain and V_BE shared out between them."""
    words = _Words()
    total = _hfe({**ratings, "hfe_max": ratings.get("hfe_max", 10.0 * ratings["hfe_min"])} if "hfe_min" in ratings else {
        "hfe_min": 1000.0, "hfe_max": 20000.0}, model, words)  # fmt: skip
    words.usual.append("its two transistors share current gain and base-emitter voltage evenly, without inner resistors")
    hfe = (math.sqrt(total[0]), math.sqrt(total[1]))
    halves = {name: 0.5 * ratings[name] for name in ("vbe", "vbe_min", "vbe_max") if name in ratings}
    kept = {name: value for name, value in ratings.items() if not name.startswith(("vbe", "hfe"))}
    at = {"vbe_at": ratings["vbe_at"]} if "vbe_at" in ratings else {}
    second = _bipolar({**kept, **halves, **at, "hfe_min": hfe[0], "hfe_max": hfe[1]}, model, True)
    first = {
        name: value * DRIVER_SHARE if name in ("IS", "IKF", "ISE", "CJE", "CJC") else value
        for name, value in second.model.items()
    }
    return Derived(
        second.model,
        first,
        hfe,
        second.vbe_spread_V,
        words.not_assumed() + second.derived,
        tuple(words.assumed) + second.assumed,
    )


def _mosfet(kind: str, ratings: Mapping[str, float], model: Model) -> Derived:
    if model:
        return Derived(model)
    words = _Words()
    spread: Pair | None = None
    at_A = ratings.get("vgs_th_at", 250e-6)
    low, high = ratings.get("vgs_th_min"), ratings.get("vgs_th_max")
    if low is not None and high is not None:
        threshold = ratings.get("vgs_th", 0.5 * (low + high))
        spread = (threshold - low, high - threshold)
        words.derived.append(f"V_TO from V_GS(th) {low:g} V to {high:g} V")
    elif "vgs_th" in ratings:
        threshold, spread = ratings["vgs_th"], DEFAULT_V_TH_SPREAD
        words.derived.append(f"V_TO from V_GS(th) {threshold:g} V")
        words.assumed.append(f"V_GS(th) within {spread[0]:g} V")
    else:
        threshold, spread = DEFAULT_V_TH, DEFAULT_V_TH_SPREAD
        words.assumed.append(f"V_GS(th) {threshold:g} V, within {spread[0]:g} V")
    K_P = _transconductance(ratings, threshold, words)
    # what the channel does not explain of the on-resistance is the drain's
    on_ohm = ratings.get("rds_on_typ", ratings.get("rds_on", 0.0))
    channel_ohm = 1.0 / (K_P * max(GATE_DRIVE_V - threshold, 1.0))
    words.usual.append(f"a channel-length modulation of {DEFAULT_LAMBDA:g} per volt")
    made = {
        "VTO": (threshold - math.sqrt(2.0 * at_A / K_P)) * (1.0 if kind == "nmos" else -1.0),
        "KP": K_P,
        "LAMBDA": DEFAULT_LAMBDA,
        "RD": max(on_ohm - channel_ohm, 0.0),
    }
    return Derived(made, vbe_spread_V=spread, derived=words.not_assumed(), assumed=tuple(words.assumed))


def _transconductance(ratings: Mapping[str, float], threshold_V: float, words: _Words) -> float:
    """Return K_P in A/V^2: from g_fs at a current (g_fs^2 / 2 I_D), else from R_DS(on), else from the rated current."""
    g_fs = ratings.get("gfs", 1.5 * ratings["gfs_min"] if "gfs_min" in ratings else None)
    at_A = ratings.get("gfs_at", 0.5 * ratings["id"] if "id" in ratings else None)
    if g_fs is not None and at_A is not None:
        words.derived.append(f"K_P from g_fs {g_fs:g} S at {format_quantity(at_A, 'A')}")
        return g_fs * g_fs / (2.0 * at_A)
    on_ohm = ratings.get("rds_on_typ", ratings.get("rds_on"))
    over_V = max(GATE_DRIVE_V - threshold_V, 1.0)
    if on_ohm is not None and on_ohm > 0.0:
        words.derived.append(f"K_P from R_DS(on) {format_quantity(on_ohm, 'ohm')}")
        words.usual.append("half of R_DS(on) in the channel")
        return 2.0 / (on_ohm * over_V)
    rated_A = ratings.get("id", 10.0)
    words.assumed.append(f"a transconductance that takes {format_quantity(rated_A, 'A')} at 4 V above the threshold")
    return rated_A / 8.0


def _diode(kind: str, ratings: Mapping[str, float], model: Model) -> Derived:
    if model:
        return Derived(model)
    words = _Words()
    spread: Pair | None = None
    if "vf" in ratings and "vf_at" in ratings:
        V_F, at_A = ratings["vf"], ratings["vf_at"]
        words.derived.append(f"I_S from V_F {V_F:g} V at {format_quantity(at_A, 'A')}")
    else:
        V_F, spread = DEFAULT_V_F, DEFAULT_V_F_SPREAD
        at_A = 0.01 * ratings["if"] if "if" in ratings else DEFAULT_I_F
        words.assumed.append(f"V_F {V_F:g} V at {format_quantity(at_A, 'A')}, within {spread[0]:g} V")
    words.usual.append(f"an emission coefficient of {DIODE_N:g}")
    made = {"IS": saturation_current(at_A, V_F, DIODE_N), "N": DIODE_N}
    if kind == "zener":
        made |= _breakdown(ratings, words)
    return Derived(made, vbe_spread_V=spread, derived=words.not_assumed(), assumed=tuple(words.assumed))


def _breakdown(ratings: Mapping[str, float], words: _Words) -> dict[str, float]:
    """Return B_V, I_BV, N_BV and the series resistance that makes up ``zz``; empty where no voltage is stated."""
    V_Z = ratings.get("vz")
    if V_Z is None and {"vz_min", "vz_max"} <= ratings.keys():
        V_Z = 0.5 * (ratings["vz_min"] + ratings["vz_max"])
    if V_Z is None:
        return {}
    at_A = ratings.get("vz_at", 5e-3)
    if "vz_at" not in ratings:
        words.usual.append(f"the zener voltage holds at {format_quantity(at_A, 'A')}")
    words.derived.append(f"B_V from V_Z {V_Z:g} V at {format_quantity(at_A, 'A')}")
    slope_ohm = BOLTZMANN_V_PER_K * T0_K / at_A
    R_S = max(ratings.get("zz", 0.0) - slope_ohm, 0.0)
    return {"BV": V_Z - at_A * R_S, "IBV": at_A, "NBV": 1.0, "RS": R_S}
