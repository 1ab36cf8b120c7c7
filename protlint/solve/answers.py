"""The answers: from a limiter's circuit to a ``Solution``.

The order of work: the drive swept into the short at three ambients, with and without the shunt, which shows its on end,
holds, and roughly where the limiter begins; the locus; the crossing itself; the worst corners of all figures; sensitivities.
Each step is a batch of lanes or a few, started from the step before.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from protlint.solve.begins import nowhere
from protlint.solve.circuit import Circuit
from protlint.solve.corners import one_at_a_time, small_steps
from protlint.solve.devices import Array
from protlint.solve.latch import always_trips, find_trips, settle, with_trips
from protlint.solve.locus import PASS_V, Loci, fill, run_at
from protlint.solve.memo import Memo
from protlint.solve.network import compile_network
from protlint.solve.nominal import Nominal, solve_nominal
from protlint.solve.parameters import CircuitError
from protlint.solve.ranges import Ranges, find_ranges
from protlint.solve.regulation import regulation
from protlint.solve.solution import Currents, Pair, Point, Sensitivity, Shorted, Solution
from protlint.solve.stage import Run, Stage, Sweep, points, run_stage, shunt_and_pass_current, sweep_stage

DRIVE_SHARE = 0.9
"""Where holds is above this share of the unlimited current (the shunt out gains less than a ninth), the drive limits."""

USUAL = 1
"""Place of the usual ambient among the three."""


def solve(circuit: Circuit, ambients_degC: tuple[float, float, float], *, memo: Memo | None = None) -> Solution:
    """Solve a limiter's circuit at three ambients (low, usual, high).

    Everything but ``loop`` and ``step`` of the ``Solution`` is filled. A circuit that cannot be solved gives a solution
    whose ``not_solved`` says why; no exception and no NaN comes out. With a ``memo`` an equal circuit, whatever its names,
    is solved once.
    """
    if memo is not None and (known := memo.recall(circuit, ambients_degC)) is not None:
        return known
    try:
        if not all(-200.0 <= ambient <= 500.0 for ambient in ambients_degC):
            raise CircuitError(f"ambients of {', '.join(f'{ambient:g}' for ambient in ambients_degC)} degC make no sense")
        # NaN marks what was not solved and goes through the arithmetic on purpose; none of it gets into a solution
        with np.errstate(all="ignore"):
            stage, sweep, shorts = _worst_short(circuit, ambients_degC)
            nominal = solve_nominal(stage, sweep)
            if circuit.latch:
                trips = find_trips(stage, ambients_degC)
                nominal = replace(nominal, begins=nowhere(nominal.begins))
                only_holds = always_trips(trips, nominal.holds_A)
                answers = with_trips(stage, _answers(stage, nominal, ambients_degC, only_holds=only_holds), trips)
            else:
                answers = _answers(stage, nominal, ambients_degC)
        solution = replace(answers, short=stage.short, shorts=shorts, assumed=_assumed(circuit))
    except CircuitError as reason:
        return Solution(not_solved=str(reason), assumed=_assumed(circuit))
    if memo is not None:
        memo.keep(circuit, ambients_degC, solution)
    return solution


def _assumed(circuit: Circuit) -> tuple[str, ...]:
    return circuit.assumed + tuple(sentence for device in circuit.devices for sentence in device.assumed)


def _worst_short(circuit: Circuit, ambients_degC: tuple[float, ...]) -> tuple[Stage, Sweep, tuple[Shorted, ...]]:
    """Sweep the drive into every short; return the stage and sweep of the one with the greatest holds, and all of them."""
    network = compile_network(circuit)
    found: list[tuple[float, Stage, Sweep]] = []
    shorts: list[Shorted] = []
    reason: CircuitError | None = None
    for node in circuit.shorts:
        try:
            stage, sweep = sweep_stage(network, node, ambients_degC, USUAL)
            sweep = settle(stage, sweep) if circuit.latch else sweep
        except CircuitError as error:
            reason = reason or error
            shorts.append(Shorted(node, (None,) * len(ambients_degC), None))
            continue
        short = sweep.full_drive(0)
        held = points(stage, short, [USUAL])
        shorts.append(Shorted(node, tuple(_number(value) for value in short.output_A), held[0] if held else None))
        if not np.isnan(short.output_A).all():
            found.append((float(np.nanmax(short.output_A)), stage, sweep))
    if not found:
        raise reason or CircuitError("no operating point was found with the output shorted")
    _, stage, sweep = max(found, key=lambda entry: entry[0])
    return stage, sweep, tuple(shorts)


def _answers(stage: Stage, nominal: Nominal, ambients_degC: tuple[float, ...], *, only_holds: bool = False) -> Solution:
    ranges = find_ranges(stage, nominal, only_holds=only_holds)
    locus_run = _usual_locus(stage, nominal)
    locus = points(stage, locus_run, range(locus_run.lanes.count))
    held = points(stage, nominal.short, [USUAL])
    carry = (
        points(stage, nominal.carry, [USUAL]) if nominal.carry is not None and np.isfinite(nominal.carry_V[USUAL]) else ()
    )
    ambients = range(len(ambients_degC))
    shares = shunt_and_pass_current(stage, nominal.short)
    return Solution(
        currents=tuple(_currents(nominal, ranges, shares, place, ambients_degC[place]) for place in ambients),
        locus=locus,
        held_short=held[0] if held else None,
        worst_point=_hottest(locus, stage.network.circuit.pass_devices),
        at_carry=carry[0] if carry else None,
        high_short=points(stage, ranges.high_short, ambients),
        high_locus=tuple(
            points(stage, ranges.high_locus, np.flatnonzero(ranges.high_owner == place).tolist()) for place in ambients
        ),
        unlimited=points(stage, nominal.unlimited, ambients),
        on_end="high" if stage.on_end else "low",
        sources=stage.way < 0.0,
        sensitivities=_sensitivities(stage, nominal),
        regulates=regulation(stage, nominal, USUAL) if stage.network.circuit.regulates else None,
        corners=_corner_steps(stage, ranges),
        not_checked=_not_checked(stage, nominal, ambients_degC),
    )


def _hottest(locus: tuple[Point, ...], passing: tuple[str, ...]) -> Point | None:
    """Return the point at which a pass device turns most power to heat."""
    if not locus or not passing:
        return None
    return max(locus, key=lambda point: max(point.states[name].power_W for name in passing))


def _usual_locus(stage: Stage, nominal: Nominal) -> Run:
    """Return the run of the locus at usual ambient, at least 41 points."""
    only = nominal.conditions.pick(np.array([USUAL]))
    mine = nominal.loci.of(USUAL)
    alone = Loci(
        np.zeros(len(mine), dtype=np.intp),
        nominal.loci.output_V[mine],
        nominal.loci.output_A[mine],
        nominal.loci.pass_V[mine],
        nominal.loci.inner[:, mine],
    )
    full = fill(stage, only, alone)
    return run_at(stage, only.pick(full.owner), full.output_V, full.inner)


def _currents(nominal: Nominal, ranges: Ranges, shares: tuple[Array, Array], place: int, ambient_degC: float) -> Currents:
    def pair(kind: str) -> Pair | None:
        low, high = ranges.by_kind[kind][:, place].tolist()
        return (low, high) if np.isfinite(low) and np.isfinite(high) else None

    carry = carry_unlimited = None
    if nominal.carry is not None and nominal.carry_unlimited is not None and np.isfinite(nominal.carry_V[place]):
        carry, carry_unlimited = nominal.carry.output_A[place], nominal.carry_unlimited.output_A[place]
    return Currents(
        ambient_degC=ambient_degC,
        begins_A=_number(nominal.begins.output_A[place]),
        holds_A=_number(nominal.holds_A[place]),
        carries_A=_number(nominal.carries_A[place]),
        most_A=_number(nominal.most_A[place]),
        unlimited_A=_number(nominal.unlimited.output_A[place]),
        shunt_A=_number(shares[0][place]),
        pass_A=_number(shares[1][place]),
        limited_by_short=_limited_by(nominal.holds_A[place], nominal.unlimited.output_A[place]),
        limited_by_output=_limited_by(carry, carry_unlimited),
        begins_range_A=pair("begins"),
        holds_range_A=pair("holds"),
        carries_range_A=pair("carries"),
        most_range_A=pair("most"),
    )


def _limited_by(limited_A: float | None, unlimited_A: float | None) -> str | None:
    """Return which of the two gives the current its limit."""
    if limited_A is None or unlimited_A is None or not np.isfinite(limited_A) or not np.isfinite(unlimited_A):
        return None
    return "drive" if limited_A > DRIVE_SHARE * unlimited_A else "limiter"


def _sensitivities(stage: Stage, nominal: Nominal) -> tuple[Sensitivity, ...]:
    """Return how every parameter moves holds at usual ambient, by central differences of small steps."""
    ambient_K = float(nominal.conditions.ambient_K[USUAL])
    holds_A = float(nominal.holds_A[USUAL])
    axes = small_steps(stage.network, ambient_K)
    if not axes or not np.isfinite(holds_A) or holds_A == 0.0:
        return ()
    count = 2 * len(axes)
    run = run_stage(
        stage,
        np.full(count, ambient_K),
        axes=axes,
        corner=one_at_a_time(len(axes)),
        start=nominal.short.operating.inner[:, [USUAL]],
    )
    low, high = run.output_A.reshape(2, len(axes)) / holds_A
    found = []
    for axis, change in zip(axes, (high - low).tolist(), strict=True):
        middle = 0.5 * (axis.low + axis.high)
        step = (axis.high - axis.low) / (abs(middle) if middle else 1.0)
        if np.isfinite(change):
            found.append(Sensitivity(axis.device, axis.parameter, change / step))
    return tuple(found)


def _corner_steps(stage: Stage, ranges: Ranges) -> dict[str, dict[str, float]]:
    """Return the positions taken at usual ambient for the low and the high end of holds."""
    return {
        end: {
            f"{axis.device}.{axis.parameter}": float(position)
            for axis, position in zip(stage.axes, ranges.holds_corner[row, :, USUAL], strict=True)
            if position
        }
        for row, end in enumerate(("low", "high"))
    }


def _not_checked(stage: Stage, nominal: Nominal, ambients_degC: tuple[float, ...]) -> tuple[tuple[str, str], ...]:
    circuit = stage.network.circuit
    found: list[tuple[str, str]] = []
    for place, ambient in enumerate(ambients_degC):
        if not np.isfinite(nominal.holds_A[place]):
            found.append(("holds", f"no operating point was found in the short at {ambient:g} degC"))
        if not np.isfinite(nominal.unlimited.output_A[place]):
            found.append(("limited_by", f"no operating point was found without the shunt at {ambient:g} degC"))
        if circuit.output_V is not None and not np.isfinite(nominal.carries_A[place]):
            found.append(("carries", f"no operating point was found at the working output voltage at {ambient:g} degC"))
        lost_V = [output_V for owner, output_V in nominal.loci.lost if owner == place]
        if lost_V:
            between = f"from {min(lost_V):.3g} V to {max(lost_V):.3g} V" if len(lost_V) > 1 else f"at {lost_V[0]:.3g} V"
            found.append(("most", f"no operating point was found with the output {between}, at {ambient:g} degC"))
    if circuit.output_V is None and circuit.ground_leg:
        found.append(("carries", "output"))
    elif circuit.output_V is None and not np.isfinite(nominal.carry_V).any():
        found.append(("carries", f"no output voltage leaves the pass device {PASS_V:g} V"))
    return tuple(found)


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
