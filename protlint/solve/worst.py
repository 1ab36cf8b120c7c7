"""The least damping of the limiting loop over corners, ambients and fault wiring.

Fault wiring of 0, 0.5, 5 and 50 uH lies between the output, with the board's capacitors there, and the short. Wiring alone
makes weakly damped modes, shunt or no shunt; only the limiter's own modes count (``protlint.solve.wired``). An inductor of
the board's own that leads on from the output is one more such inductance: the short may lie behind it.

Corners are those of ``protlint.solve.corners``, and capacitors with a stated tolerance: signs from one axis at a time, then
all at their worst together. Beside the signs that lessen the damping with each wiring stand those that raise the shunt's
transconductance, for what only swings once it is large; every corner is asked about with every wiring.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from protlint.solve.constants import KELVIN
from protlint.solve.corners import Axis, one_at_a_time
from protlint.solve.devices import Array
from protlint.solve.expanded import Expanded
from protlint.solve.linear import passive_values
from protlint.solve.modes import Complex, Mask, damping, margin, partners
from protlint.solve.solution import Worst
from protlint.solve.stage import Run, Stage, run_stage
from protlint.solve.wired import Wired, counting, linearise, look, wired_frequencies

WIRING_H = (0.0, 0.5e-6, 5e-6, 50e-6)


@dataclass(frozen=True, slots=True)
class Scope:
    """What the worst is sought over: the stage's axes, then the capacitors', and the ambients in degC; ``expanded`` is its
    network with a wired output, ``capacitors`` the places of those axes among the passive stores."""

    stage: Stage
    expanded: Expanded
    axes: tuple[Axis, ...]
    capacitors: tuple[int, ...]
    ambients_degC: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Scene:
    """Lanes at corners: positions (axes, lanes), place of the ambient (lanes,), the run they come from and their places in
    it (lanes,)."""

    position: Array
    ambient: NDArray[np.intp]
    run: Run
    place: NDArray[np.intp]


def make_scope(stage: Stage, expanded: Expanded, ambients_degC: Sequence[float]) -> Scope:
    """Return all that can move the damping of a stage."""
    loose = [
        (place, Axis(device.name, "C", "capacitor", place, 1.0 - device.tolerance, 1.0 + device.tolerance))
        for place, device in enumerate(expanded.passive)
        if device.kind == "capacitor" and device.tolerance > 0.0
    ]
    return Scope(
        stage=stage,
        expanded=expanded,
        axes=(*stage.axes, *(axis for _, axis in loose)),
        capacitors=tuple(place for place, _ in loose),
        ambients_degC=tuple(ambients_degC),
    )


def opening_scene(scope: Scope, inner: Array) -> Scene:
    """Solve the nominal circuit at every ambient, then one axis at a time at every ambient, in this order.

    ``inner`` (ports, ambients) are the inner voltages of the held short.
    """
    axes = len(scope.axes)
    alone = np.arange(len(scope.ambients_degC))
    single = one_at_a_time(axes)
    position = np.concatenate((np.zeros((axes, len(alone))), np.tile(single, len(alone))), axis=1)
    return _solve(scope, position, np.concatenate((alone, np.repeat(alone, single.shape[1]))), inner)


def find_worst(scope: Scope, opening: Scene) -> tuple[Worst, ...]:
    """Find the least damping that counts, from the opening scene on: one for each inductance in the short, none first."""
    ambients = len(scope.ambients_degC)
    first, wired = _linear(scope, opening)
    nominal = np.flatnonzero(~first.position.any(axis=0))[:ambients]
    own_H = scope.expanded.network.circuit.output_inductance_H
    found = {wiring_H: Worst(1.0) for wiring_H in (*WIRING_H, *([own_H] if own_H > 0.0 else []))}
    signs, owners = [], []
    alone: list[tuple[float, NDArray[np.intp]]] = []
    for wiring_H in found:
        s = wired_frequencies(wired, wiring_H)
        counts = counting(wired.pick(nominal), wiring_H, s[nominal])
        found[wiring_H] = _least(scope, first, nominal, np.where(counts, s[nominal], np.inf), wiring_H)
        for lane, counting_here in zip(nominal, counts, strict=True):
            mine = np.flatnonzero(first.ambient == first.ambient[lane])
            own = _own(s[mine], counting_here)
            signs.append(_signs(first.position[:, mine], margin(own)))
            owners.append(first.ambient[lane])
            alone.append((wiring_H, mine[[int(np.argmin(damping(own).min(axis=1)))]]))
    for lane in nominal:
        mine = np.flatnonzero(first.ambient == first.ambient[lane])
        signs.append(_signs(first.position[:, mine], -wired.source[:, mine].sum(axis=0)))
        owners.append(first.ambient[lane])
    if not owners:
        return tuple(found.values())
    inner = opening.run.operating.inner[:, :ambients]
    together = _solve(scope, np.array(signs).T, np.array(owners), inner)
    last, wired_last = _linear(scope, together)
    for wiring_H in found:
        every = np.arange(len(last.place))
        found[wiring_H] = min(found[wiring_H], _counted(scope, last, wired_last, every, wiring_H), key=_damping)
    for wiring_H, lanes in alone:
        # one axis by itself is hardly ever worse than all together; whose mode it is is asked only where it is
        s = wired_frequencies(wired.pick(lanes), wiring_H)
        if float(damping(s).min()) < found[wiring_H].damping:
            found[wiring_H] = min(found[wiring_H], _counted(scope, first, wired, lanes, wiring_H), key=_damping)
    return tuple(found.values())


def _damping(worst: Worst) -> float:
    return worst.damping


def _counted(scope: Scope, scene: Scene, wired: Wired, lanes: NDArray[np.intp], wiring_H: float) -> Worst:
    """Return the least damping that counts among lanes of a scene."""
    only = wired.pick(lanes)
    s = wired_frequencies(only, wiring_H)
    return _least(scope, scene, lanes, np.where(counting(only, wiring_H, s), s, np.inf), wiring_H)


def scene_at(scope: Scope, place: Worst, inner: Array) -> Scene:
    """Solve the one ambient and corner of a place that is one, ``inner`` as for :func:`opening_scene`."""
    assert place.ambient_degC is not None
    position = np.array([[place.corner.get(f"{axis.device}.{axis.parameter}", 0.0)] for axis in scope.axes])
    ambient = np.array([scope.ambients_degC.index(place.ambient_degC)])
    return _solve(scope, position.reshape(len(scope.axes), 1), ambient, inner)


def damping_at(scope: Scope, scene: Scene, wiring_H: float) -> float:
    """Return the least damping that counts in a scene with one inductance in the short."""
    _, wired = _linear(scope, scene)
    s = wired_frequencies(wired, wiring_H)
    return float(damping(np.where(counting(wired, wiring_H, s), s, np.inf)).min(initial=1.0))


def _solve(scope: Scope, position: Array, ambient: NDArray[np.intp], inner: Array) -> Scene:
    """Solve lanes at corners, starting from inner voltages (ports, ambients)."""
    ambient_K = np.array(scope.ambients_degC)[ambient] + KELVIN
    corner = position[: len(scope.stage.axes)]
    run = run_stage(scope.stage, ambient_K, corner=corner, start=inner[:, ambient])
    return Scene(position, ambient, run, np.arange(len(ambient)))


def _linear(scope: Scope, scene: Scene) -> tuple[Scene, Wired]:
    """Linearise the lanes of a scene that were solved; return those lanes with it."""
    solved = np.flatnonzero(scene.run.operating.converged)
    position = scene.position[:, solved]
    passive = np.tile(passive_values(scope.expanded), len(solved))
    for row, place in enumerate(scope.capacitors, start=len(scope.stage.axes)):
        passive[place] *= 1.0 + position[row] * (scope.axes[row].high - 1.0)
    kept = Scene(position, scene.ambient[solved], scene.run, solved)
    return kept, linearise(scope.expanded, look(scope.expanded, scene.run, solved, passive))


def _own(s: Complex, counts: Mask) -> Complex:
    """Return natural frequencies (lanes, modes) without what the first lane's foreign modes have become.

    Foreign are the modes of the first lane that swing and, by ``counts`` (modes,), are not the limiter's.
    """
    foreign = np.flatnonzero(~counts & np.isfinite(s[0]) & (s[0].imag != 0.0))
    own = s.copy()
    if len(foreign):
        became = partners(np.broadcast_to(s[0], s.shape), s)
        np.put_along_axis(own, became[:, foreign], np.inf, axis=1)
    return own


def _signs(position: Array, margins: Array) -> Array:
    """Return the position of every axis (axes,) that lessens the margin, from lanes (axes, lanes) with the nominal first."""
    best = np.zeros(len(position))
    least = np.full(len(position), margins[0])
    for lane in range(1, len(margins)):
        axis = int(np.argmax(np.abs(position[:, lane])))
        if margins[lane] < least[axis]:
            least[axis], best[axis] = margins[lane], position[axis, lane]
    return best


def _least(scope: Scope, scene: Scene, lanes: NDArray[np.intp], own: Complex, wiring_H: float) -> Worst:
    """Return the least damping of modes (lanes, modes) and where it lies."""
    values = damping(own)
    lane, mode = np.unravel_index(int(np.argmin(values)), values.shape)
    if not values[lane, mode] < 1.0:
        return Worst(1.0)
    place = int(lanes[lane])
    return Worst(
        damping=float(values[lane, mode]),
        at_Hz=float(np.abs(own[lane, mode]) / (2.0 * np.pi)),
        ambient_degC=scope.ambients_degC[scene.ambient[place]],
        wiring_H=wiring_H,
        corner={
            f"{axis.device}.{axis.parameter}": float(value)
            for axis, value in zip(scope.axes, scene.position[:, place], strict=True)
            if value
        },
    )
