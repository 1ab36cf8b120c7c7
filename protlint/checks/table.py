"""Every check by name, in the order they are asked. Their levels, thresholds and reasons stand in rules/checks.toml."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping

from protlint.checks import (
    base_stop,
    bypassed,
    currents,
    drive,
    heat,
    hidden,
    inputs,
    load,
    loop,
    pass_area,
    pass_device,
    reverse,
    second_road,
    sets,
    sharing,
    shunt,
    timing,
    unguarded,
    wiring,
)
from protlint.checks.board_case import BoardAnswer, BoardCase
from protlint.checks.case import Answer, Case

CHECKS: Mapping[str, Callable[[Case], Iterable[Answer]]] = {
    "carry-not-met": currents.carry_not_met,
    "drive-insufficient": currents.drive_insufficient,
    "cap-exceeded": currents.cap_exceeded,
    "base-stop-absent": base_stop.base_stop_absent,
    "base-stop-low": base_stop.base_stop_low,
    "base-stop-high": base_stop.base_stop_high,
    "sense-resistor-power": heat.sense_resistor_power,
    "resistor-power": heat.resistor_power,
    "drive-unlimited": drive.drive_unlimited,
    "driver-overloaded": drive.driver_overloaded,
    "shunt-overloaded": shunt.shunt_overloaded,
    "reverse-base-emitter": reverse.reverse_base_emitter,
    "pass-overheated": pass_device.pass_overheated,
    "pass-outside-safe-area": pass_area.pass_outside_safe_area,
    "foldback-locks-out": load.foldback_locks_out,
    "compensation-absent": loop.compensation_absent,
    "loop-undamped": loop.loop_undamped,
    "trips-on-peaks": timing.trips_on_peaks,
    "trips-late": timing.trips_late,
    "share-unsensed": sharing.share_unsensed,
    "value-unreadable": inputs.value_unreadable,
    "part-data-missing": inputs.part_data_missing,
    "pins-unknown": inputs.pins_unknown,
    "pin-on-two-nets": inputs.pin_on_two_nets,
    "designator-doubtful": inputs.designator_doubtful,
    "part-data-contradicts": inputs.part_data_contradicts,
}
"""Asked of every limiter."""

WITHOUT_SOLUTION = frozenset(
    {
        "value-unreadable", "part-data-missing", "pins-unknown", "pin-on-two-nets", "designator-doubtful",
        "part-data-contradicts", *wiring.WIRING_FAULTS,
    }
)  # fmt: skip
"""Those that are asked even where the circuit could not be solved."""

BOUNDED = frozenset(
    {
        "base-stop-absent", "base-stop-low", "base-stop-high", "sense-resistor-power", "resistor-power", "driver-overloaded",
        "shunt-overloaded", "reverse-base-emitter", "pass-overheated", "pass-outside-safe-area", "compensation-absent",
        "loop-undamped", "trips-on-peaks", "trips-late",
    }
)  # fmt: skip
"""Those that are not asked where nothing bounds the drive: drive-unlimited then says all there is to say."""

BOARD_CHECKS: Mapping[str, Callable[[BoardCase], Iterable[BoardAnswer]]] = {
    **{fault: wiring.wiring_check(fault) for fault in wiring.WIRING_FAULTS},
    "sense-bypassed": bypassed.sense_bypassed,
    "limiter-absent": unguarded.limiter_absent,
    "second-road": second_road.second_road,
    "halves-unequal": sets.halves_unequal,
    "channels-unequal": sets.channels_unequal,
    "pins-unknown": hidden.hidden_limiters,
}
"""Asked of the whole board once, when every limiter has been asked."""

OF_NO_LIMITER = frozenset({"limiter-absent"})
"""Those of the whole board that ask nothing of a limiter that was found."""
