"""The drive resistor to fit: the least that leaves enough to be bearable, the greatest that leaves enough to work."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

from protlint.checks.case import Case
from protlint.checks.sizing import solve_again, with_resistance
from protlint.findings import Fit, Remedy
from protlint.quantities import format_quantity, within
from protlint.solve.circuit import Circuit

REACH = 4.0
"""How far above what a hand calculation gives values are tried."""

LEAST_SHARE = 0.05
"""A drive resistor is not made smaller than this share of itself: something else is wrong then."""


def least_drive_resistance(case: Case, times: float, does: Callable[[Case], bool]) -> Remedy | None:
    """Return the least resistance of E24 in the drive with which ``does`` is true of the case so changed, found by
    solving; None where none is.

    ``times`` is by how much the drive's current has to come down, for where to begin.
    """
    names, now_ohm = _drive_resistors(case)
    drive = case.circuit.drive
    points = [point for point in case.solution.high_short if point.drive_A]
    if not points or math.isinf(times):
        return None
    point = max(points, key=lambda one: abs(one.drive_A))
    end_V = max((drive.low_V.usual, drive.high_V.usual), key=lambda volts: abs(volts - point.output_V))
    guess_ohm = max(now_ohm, abs(end_V - point.output_V) / abs(point.drive_A), 1.0) * times
    values = within(max(now_ohm, guess_ohm / REACH, 1.0), guess_ohm * REACH, "E24")
    return _first(case, names, now_ohm, [ohm for ohm in values if ohm > now_ohm], does)


def greatest_drive_resistance(case: Case, does: Callable[[Case], bool]) -> Remedy | None:
    """Return the greatest resistance of E24 in the drive, below the one drawn, with which ``does`` is true; None where none
    is or there is no drive resistor."""
    names, now_ohm = _drive_resistors(case)
    if not names:
        return None
    values = within(LEAST_SHARE * now_ohm, now_ohm, "E24")
    return _first(case, names, now_ohm, [ohm for ohm in reversed(values) if ohm < now_ohm], does)


def _drive_resistors(case: Case) -> tuple[tuple[str, ...], float]:
    """Return the devices of the drive's resistors, and their resistance; where there are none, the drive's own."""
    names = tuple(dict.fromkeys(name for part in case.parts("drive") for name in case.devices_of(part)))
    return names, sum(case.device(name).model["R"] for name in names) if names else case.circuit.drive.resistance_ohm


def _first(
    case: Case, names: tuple[str, ...], now_ohm: float, values: Sequence[float], does: Callable[[Case], bool]
) -> Remedy | None:
    """Return the first of the values that does, as a remedy; once one does, all after it do: found by halving."""

    def fits(ohm: float) -> bool:
        circuit = _with_drive(case.circuit, names, now_ohm, ohm)
        solution = solve_again(case, circuit)
        return solution.not_solved is None and does(case.changed(circuit, solution))

    low, high = 0, len(values)
    while low < high:
        middle = (low + high) // 2
        low, high = (low, middle) if fits(values[middle]) else (middle + 1, high)
    if low == len(values):
        return None
    parts = case.parts("drive")
    where = f"as {parts[0]}" if len(parts) == 1 else "in series with the drive"
    fitted = tuple(Fit(part, values[low]) for part in parts) if names and len(parts) == 1 else ()
    return f"fit {format_quantity(values[low], 'ohm')} {where}", fitted


def _with_drive(circuit: Circuit, names: tuple[str, ...], now_ohm: float, ohm: float) -> Circuit:
    """Return the circuit with so much resistance in its drive."""
    if not names:
        return replace(circuit, drive=replace(circuit.drive, resistance_ohm=ohm))
    return with_resistance(circuit, names, ohm / now_ohm)
