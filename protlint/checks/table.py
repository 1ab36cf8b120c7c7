"""Every check by name, in the order they are asked. Their levels, thresholds and reasons stand in rules/checks.toml."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping

from protlint.checks import base_stop, currents, heat, inputs, loop
from protlint.checks.case import Answer, Case

CHECKS: Mapping[str, Callable[[Case], Iterable[Answer]]] = {
    "carry-not-met": currents.carry_not_met,
    "drive-insufficient": currents.drive_insufficient,
    "cap-exceeded": currents.cap_exceeded,
    "base-stop-absent": base_stop.base_stop_absent,
    "sense-resistor-power": heat.sense_resistor_power,
    "compensation-absent": loop.compensation_absent,
    "value-unreadable": inputs.value_unreadable,
    "part-data-missing": inputs.part_data_missing,
}
"""Asked of every limiter."""

WITHOUT_SOLUTION = frozenset({"value-unreadable", "part-data-missing"})
"""Those that are asked even where the circuit could not be solved."""
