"""The ratings part data can hold: each name once, with its dimension and what it says."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Rating:
    """One rating's dimension (a key of ``quantities.DIMENSIONS``, or ``number``) and what it says."""

    dimension: str
    says: str


@dataclass(frozen=True, slots=True)
class Figure:
    """One rating: SI value (temperatures in degC) and its source (a publication, or the word ``memory``)."""

    value: float
    source: str


RATINGS: dict[str, Rating] = {
    # Heat. Every rating is a magnitude: a P-type is told by its kind, not by signs.
    "power": Rating("power", "dissipation in free air; of a resistor its rated power"),
    "power_at": Rating("temperature", "ambient up to which power holds (25 degC; of a resistor the knee of its derating)"),
    "slope": Rating("thermal conductance", "how much of power is lost per kelvin above power_at"),
    "power_case": Rating("power", "dissipation with the case held at power_case_at"),
    "power_case_at": Rating("temperature", "case temperature for power_case (25 degC)"),
    "slope_case": Rating("thermal conductance", "how much of power_case is lost per kelvin above power_case_at"),
    "tj_max": Rating("temperature", "highest junction temperature"),
    "rth_jc": Rating("thermal resistance", "junction to case"),
    "rth_ja": Rating("thermal resistance", "junction to free air"),
    # Bipolar transistors.
    "vceo": Rating("voltage", "collector to emitter, base open"),
    "vcbo": Rating("voltage", "collector to base, emitter open"),
    "vebo": Rating("voltage", "emitter to base in reverse, collector open"),
    "ic": Rating("current", "collector current, continuous"),
    "ic_peak": Rating("current", "collector current, peak"),
    "ib": Rating("current", "base current; of a thyristor the gate current"),
    "hfe_min": Rating("number", "least current gain at hfe_at"),
    "hfe_max": Rating("number", "greatest current gain at hfe_at"),
    "hfe_at": Rating("current", "collector current for hfe_min and hfe_max"),
    "vbe": Rating("voltage", "base to emitter, typical, at vbe_at"),
    "vbe_min": Rating("voltage", "base to emitter, least, at vbe_at"),
    "vbe_max": Rating("voltage", "base to emitter, greatest, at vbe_at"),
    "vbe_at": Rating("current", "collector current for vbe, vbe_min and vbe_max"),
    "vbe_sat_min": Rating("voltage", "base to emitter in saturation, least, at vbe_sat_at"),
    "vbe_sat_max": Rating("voltage", "base to emitter in saturation, greatest, at vbe_sat_at"),
    "vbe_sat_at": Rating("current", "collector current for vbe_sat_min and vbe_sat_max"),
    "vbe_slope": Rating("voltage per kelvin", "change of the base-emitter voltage at constant current"),
    "ft": Rating("frequency", "transition frequency"),
    "ft_at": Rating("current", "collector current for ft"),
    "cob": Rating("capacitance", "collector to base, emitter open"),
    "cob_at": Rating("voltage", "reverse voltage for cob"),
    "cib": Rating("capacitance", "emitter to base, collector open"),
    "cib_at": Rating("voltage", "reverse voltage for cib"),
    # Field-effect transistors.
    "vds": Rating("voltage", "drain to source"),
    "vgs": Rating("voltage", "gate to source, either way"),
    "id": Rating("current", "drain current, continuous, case at 25 degC"),
    "id_peak": Rating("current", "drain current, peak"),
    "vgs_th": Rating("voltage", "gate threshold, typical, at vgs_th_at"),
    "vgs_th_min": Rating("voltage", "gate threshold, least"),
    "vgs_th_max": Rating("voltage", "gate threshold, greatest"),
    "vgs_th_at": Rating("current", "drain current for the gate threshold"),
    "vgs_th_slope": Rating("voltage per kelvin", "change of the gate threshold"),
    "gfs": Rating("conductance", "forward transconductance, typical, at gfs_at"),
    "gfs_min": Rating("conductance", "forward transconductance, least, at gfs_at"),
    "gfs_at": Rating("current", "drain current for gfs"),
    "rds_on": Rating("resistance", "drain to source, fully on, greatest"),
    "rds_on_typ": Rating("resistance", "drain to source, fully on, typical"),
    "ciss": Rating("capacitance", "input"),
    "coss": Rating("capacitance", "output"),
    "crss": Rating("capacitance", "reverse transfer"),
    "qg": Rating("charge", "gate charge"),
    # Diodes and zeners.
    "vr": Rating("voltage", "reverse voltage"),
    "if": Rating("current", "forward current, continuous"),
    "if_peak": Rating("current", "forward current, peak"),
    "vf": Rating("voltage", "forward voltage, typical, at vf_at"),
    "vf_max": Rating("voltage", "forward voltage, greatest, at vf_at"),
    "vf_at": Rating("current", "forward current for vf"),
    "cj": Rating("capacitance", "junction, no bias"),
    "vz": Rating("voltage", "zener voltage at vz_at"),
    "vz_min": Rating("voltage", "zener voltage, least"),
    "vz_max": Rating("voltage", "zener voltage, greatest"),
    "vz_at": Rating("current", "current for vz"),
    "zz": Rating("resistance", "differential resistance at vz_at"),
    # Thyristors.
    "igt": Rating("current", "gate current that fires it, typical"),
    "igt_max": Rating("current", "gate current that fires it, greatest"),
    "vgt": Rating("voltage", "gate to cathode where it fires, typical"),
    "vgt_max": Rating("voltage", "gate to cathode where it fires, greatest"),
    "ih": Rating("current", "anode current that keeps it on, typical"),
    "rgk": Rating("resistance", "gate to cathode outside, for which ih holds"),
    "vtm": Rating("voltage", "anode to cathode when on, at vtm_at"),
    "vtm_at": Rating("current", "anode current for vtm"),
    # Passive parts.
    "zero_at": Rating("temperature", "temperature at which a resistor's derated power is zero"),
    "voltage_max": Rating("voltage", "highest voltage across the part"),
    "current_max": Rating("current", "highest current through the part"),
    "resistance": Rating("resistance", "at direct current, cold"),
    "tcr": Rating("per kelvin", "temperature coefficient of resistance, either way"),
    "tolerance": Rating("fraction", "spread of the value, either way"),
}

STATIC_FIGURES = (
    "model", "hfe_min", "hfe_max", "vbe", "vbe_min", "vbe_max", "vgs_th", "vgs_th_min", "vgs_th_max", "gfs", "gfs_min",
    "rds_on", "rds_on_typ", "vf", "vz", "vz_min", "vz_max", "zz", "igt", "igt_max", "vgt", "vgt_max", "ih", "rgk", "vtm",
    "resistance",
)  # fmt: skip
"""Of what a part's model for direct current is made: its model, or the ratings it is derived from."""

DYNAMIC_FIGURES = ("ft", "cob", "cib", "ciss", "coss", "crss", "cj")
"""Of what capacitances and transit times are made where the model states none."""

_HEAT = ("power", "power_at", "slope", "power_case", "power_case_at", "slope_case", "tj_max", "rth_jc", "rth_ja")
_BIPOLAR = (
    *_HEAT, "vceo", "vcbo", "vebo", "ic", "ic_peak", "ib", "hfe_min", "hfe_max", "hfe_at", "vbe", "vbe_min", "vbe_max",
    "vbe_at", "vbe_sat_min", "vbe_sat_max", "vbe_sat_at", "vbe_slope", "ft", "ft_at", "cob", "cob_at", "cib", "cib_at",
)  # fmt: skip
_MOSFET = (
    *_HEAT, "vds", "vgs", "id", "id_peak", "vgs_th", "vgs_th_min", "vgs_th_max", "vgs_th_at", "vgs_th_slope", "gfs",
    "gfs_min", "gfs_at", "rds_on", "rds_on_typ", "ciss", "coss", "crss", "qg",
)  # fmt: skip
_DIODE = (*_HEAT, "vr", "if", "if_peak", "vf", "vf_max", "vf_at", "cj")

RATINGS_OF: dict[str, tuple[str, ...]] = {
    "npn": _BIPOLAR,
    "pnp": _BIPOLAR,
    "npn-darlington": _BIPOLAR,
    "pnp-darlington": _BIPOLAR,
    "nmos": _MOSFET,
    "pmos": _MOSFET,
    "diode": _DIODE,
    "zener": (*_DIODE, "vz", "vz_min", "vz_max", "vz_at", "zz"),
    "thyristor": (*_HEAT, "vr", "if", "if_peak", "ib", "igt", "igt_max", "vgt", "vgt_max", "ih", "rgk", "vtm", "vtm_at"),
    "resistor": ("power", "power_at", "zero_at", "voltage_max", "current_max", "tcr", "tolerance"),
    "capacitor": ("voltage_max", "tolerance"),
    "inductor": ("current_max", "resistance", "tolerance"),
    "fuse": ("current_max", "voltage_max", "resistance"),
    "link": ("current_max",),
    "connector": ("current_max", "voltage_max"),
    "ic": _HEAT,
}
"""Which ratings a part of each kind can have; the kinds are those part data can name."""

_JUNCTION = ("IS", "EG", "XTI", "FC", "KF", "AF")
_BIPOLAR_MODEL = (
    *_JUNCTION, "BF", "NF", "VAF", "IKF", "ISE", "NE", "BR", "NR", "VAR", "IKR", "ISC", "NC", "RB", "IRB", "RBM", "RE", "RC",
    "CJE", "VJE", "MJE", "TF", "XTF", "VTF", "ITF", "PTF", "CJC", "VJC", "MJC", "XCJC", "TR", "CJS", "VJS", "MJS", "XTB",
)  # fmt: skip
_MOSFET_MODEL = (
    "VTO", "KP", "GAMMA", "PHI", "LAMBDA", "RD", "RS", "RG", "IS", "PB", "CBD", "CBS", "CGS", "CGD", "CGSO", "CGDO", "CGBO",
    "CJ", "MJ", "CJSW", "MJSW", "TOX", "FC",
)  # fmt: skip
_DIODE_MODEL = (*_JUNCTION, "N", "RS", "TT", "CJO", "VJ", "M", "BV", "IBV", "NBV")

MODEL_OF: dict[str, tuple[str, ...]] = {
    "npn": _BIPOLAR_MODEL,
    "pnp": _BIPOLAR_MODEL,
    "npn-darlington": _BIPOLAR_MODEL,
    "pnp-darlington": _BIPOLAR_MODEL,
    "nmos": _MOSFET_MODEL,
    "pmos": _MOSFET_MODEL,
    "diode": _DIODE_MODEL,
    "zener": _DIODE_MODEL,
    "resistor": ("TC1", "TC2"),
}
"""Model parameters by their published names: Gummel and Poon (1970), Shichman and Hodges (1968), the junction diode."""
