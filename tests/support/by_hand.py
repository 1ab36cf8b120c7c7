"""Closed forms for limiters, as working people calculate them by hand: flat functions on SI numbers, to hold solved circuits
against.

Every form neglects something. Symbols: V_BE the shunt's base-emitter voltage, R_S the sense resistance, R_1 from the sense
resistance to the shunt's base, R_2 (and R_3) from the base elsewhere, I_B the shunt's base current, V_O the output voltage
above the divider's other end, V_CE the voltage from the sense resistance to the supply.
"""

from __future__ import annotations

import math

from protlint.solve.constants import BOLTZMANN_V_PER_K, T0_K


def preset_limit(V_BE: float, R_S: float, R_1: float, R_2: float, *, I_B: float = 0.0) -> float:
    """Return the limit with a divider from the sense resistance over the base to its other end.

    (V_BE / R_S) (1 + R_1 / R_2) + I_B R_1 / R_S.

    Parameters
    ----------
    V_BE, R_S, R_1, R_2, I_B
        Base-emitter voltage [V], sense resistance, upper and lower leg [ohm], base current [A].

    Returns
    -------
    float
        Output current [A].

    Examples
    --------
    >>> round(preset_limit(0.62, 0.22, 220.0, 220.0), 2)
    5.64
    """
    return V_BE / R_S * (1.0 + R_1 / R_2) + I_B * R_1 / R_S


def foldback_limit(V_BE: float, R_S: float, R_1: float, R_2: float, V_O: float, *, I_B: float = 0.0) -> float:
    """Return the limit with a divider from the sense resistance over the base to ground, at an output voltage.

    With k = R_2 / (R_1 + R_2): I = (V_BE + (1 - k) V_O) / (k R_S) + I_B R_1 / R_S; the short at V_O = 0.

    Parameters
    ----------
    V_BE, R_S, R_1, R_2, V_O, I_B
        Base-emitter voltage [V], sense resistance, leg from the sense resistance and leg to ground [ohm], output voltage
        [V], base current [A].

    Returns
    -------
    float
        Output current [A].

    References
    ----------
    LM723 data sheet (ST), table of formulas: I_KNEE = V_O R3 / (R_SC R4) + V_SENSE (R3 + R4) / (R_SC R4), the same law.
    """
    k = R_2 / (R_1 + R_2)
    return (V_BE + (1.0 - k) * V_O) / (k * R_S) + I_B * R_1 / R_S


def foldback_design(V_BE: float, V_O: float, I_K: float, I_SC: float) -> tuple[float, float]:
    """Return the division k = R_2 / (R_1 + R_2) and the sense resistance for a knee and a short-circuit current.

    1 - k = (I_K / I_SC - 1) V_BE / V_O; R_S = V_O / (I_SC (1 + V_O / V_BE) - I_K).

    Parameters
    ----------
    V_BE, V_O, I_K, I_SC
        Base-emitter and output voltage [V], knee and short-circuit current [A].

    Returns
    -------
    tuple[float, float]
        k, without dimension, and R_S [ohm].

    Raises
    ------
    ValueError
        Where the knee is not above the short-circuit current or out of its reach, I_K / I_SC >= 1 + V_O / V_BE.

    Examples
    --------
    >>> k, R_S = foldback_design(0.6, 15.0, 1.0, 0.4)
    >>> round(k, 4), round(R_S, 4)
    (0.94, 1.5957)
    """
    if not 1.0 <= I_K / I_SC < 1.0 + V_O / V_BE:
        raise ValueError(f"a knee of {I_K:g} A does not go with a short-circuit current of {I_SC:g} A")
    return 1.0 - (I_K / I_SC - 1.0) * V_BE / V_O, V_O / (I_SC * (1.0 + V_O / V_BE) - I_K)


def slope_limit(V_BE: float, R_S: float, R_1: float, R_2: float, R_3: float, V_CE: float) -> float:
    """Return the limit with a further leg from the base to the supply, at a voltage across the pass device.

    V_BE (G_1 + G_2 + G_3) = I R_S (G_1 + G_2) + V_CE G_2, G = 1/R: a straight line that falls as V_CE rises.

    Parameters
    ----------
    V_BE, R_S, R_1, R_2, R_3, V_CE
        Base-emitter voltage [V], sense resistance, legs from the base to the sense resistance, to the supply and to the
        output (``math.inf`` for none) [ohm], voltage from the sense resistance to the supply [V].

    Returns
    -------
    float
        Output current [A]; negative where the limiter lets none pass.

    Examples
    --------
    >>> round(slope_limit(0.62, 0.22, 220.0, 10e3, 270.0, 0.0), 2)
    5.07
    """
    G_1, G_2, G_3 = 1.0 / R_1, 1.0 / R_2, 1.0 / R_3
    return (V_BE * (G_1 + G_2 + G_3) - V_CE * G_2) / (R_S * (G_1 + G_2))


def slope_greatest_power(V_BE: float, R_S: float, R_1: float, R_2: float, R_3: float) -> tuple[float, float]:
    """Return the greatest dissipation that a slope lets the pass device have, and the V_CE where it stands.

    P = (V_BE (G_1 + G_2 + G_3))^2 / (4 R_S (G_1 + G_2) G_2) at V_CE = V_BE (G_1 + G_2 + G_3) / (2 G_2).

    Parameters
    ----------
    V_BE, R_S, R_1, R_2, R_3
        As for :func:`slope_limit`.

    Returns
    -------
    tuple[float, float]
        Power [W] and voltage [V].
    """
    G_1, G_2, G_3 = 1.0 / R_1, 1.0 / R_2, 1.0 / R_3
    pull = V_BE * (G_1 + G_2 + G_3)
    return pull * pull / (4.0 * R_S * (G_1 + G_2) * G_2), pull / (2.0 * G_2)


def base_emitter_voltage(I_C: float, I_S: float, *, temperature_K: float = T0_K, N_F: float = 1.0) -> float:
    """Return V_BE = N_F V_T ln(I_C / I_S + 1).

    Parameters
    ----------
    I_C, I_S, temperature_K, N_F
        Collector current and saturation current at the temperature [A], temperature [K], emission coefficient.

    Returns
    -------
    float
        Base-emitter voltage [V].

    Examples
    --------
    2 mA through a transistor of 1e-14 A at V_T = 25 mV (Sedra and Smith, *Microelectronic Circuits*, problem D12.43):

    >>> round(base_emitter_voltage(2e-3, 1e-14, temperature_K=0.025 / 8.617333262e-5), 4)
    0.6505
    """
    return N_F * BOLTZMANN_V_PER_K * temperature_K * math.log1p(I_C / I_S)


def base_emitter_slope(V_BE: float, temperature_K: float, *, E_G: float = 1.11, X_TI: float = 3.0) -> float:
    """Return dV_BE/dT at constant collector current, (V_BE - E_G - X_TI V_T) / T, from the published law of I_S.

    Parameters
    ----------
    V_BE, temperature_K, E_G, X_TI
        Base-emitter voltage [V], temperature [K], energy gap [eV], temperature exponent.

    Returns
    -------
    float
        Slope [V/K].

    Examples
    --------
    >>> round(1e3 * base_emitter_slope(0.60, 300.15), 2)
    -1.96
    """
    return (V_BE - E_G - X_TI * BOLTZMANN_V_PER_K * temperature_K) / temperature_K
