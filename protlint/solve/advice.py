"""What to fit so that the limiting loop is well damped, and what each part that is there does to it.

Each capacitor is taken out in turn, and the base stop bridged, to see what it does to the damping. Then the preferred
values of IEC 60063 (E6) are tried from the smallest on, at the three usual places: collector to base of the shunt, from the
drive to the far end of the sense resistance, base to emitter. The first one that reaches the aim in the worst of corners,
ambients and fault wiring is advised, with what it does to the delay.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from protlint.quantities.series import within
from protlint.solve.circuit import Circuit, Device
from protlint.solve.delay import solve_step
from protlint.solve.expanded import Expanded, expand
from protlint.solve.loop import USUAL, WITH_CONTROL, Held, hold, solve_loop
from protlint.solve.modes import damping
from protlint.solve.network import compile_network
from protlint.solve.parameters import LINK_OHM, CircuitError
from protlint.solve.solution import Advice, Effect, Fit, Loop, Step
from protlint.solve.wired import counting, linearise, look, wired_frequencies
from protlint.solve.worst import Scene, damping_at, find_worst, make_scope, opening_scene, scene_at

AIM = 0.6
COSTS = 0.05
"""A part that lessens the damping by no more than this costs nothing worth naming."""

LEAST_F, GREATEST_F = 10e-12, 10e-6
SERIES = "E6"
ADVISED = "advised capacitor"

COLLECTOR_BASE, DRIVE_FAR, BASE_EMITTER = "collector to base", "drive to far end", "base to emitter"


def advise(
    circuit: Circuit,
    ambients_degC: tuple[float, float, float],
    *,
    short: str | None = None,
    delay: bool = True,
    loop: Loop | None = None,
    step: Step | None = None,
) -> Advice | str:
    """Return advice on the circuit's loop, or the reason why there is none.

    ``short`` as for ``protlint.solve.loop.solve_loop``; without ``delay`` the steps into the short are left out. ``loop``
    and ``step`` are the circuit's own where they are known already.
    """
    known = solve_loop(circuit, ambients_degC, short=short) if loop is None else loop
    if not isinstance(known, Loop):
        return known
    now = _figures(known)
    effects = tuple(_effects(circuit, ambients_degC, short))
    blamed = [one for one in effects if not (one.base_stop and _sets_the_limit(circuit))]
    dearest = max(blamed, key=lambda one: one.worst_damping, default=None)
    costs = dearest.part if dearest is not None and dearest.worst_damping > now[1] + COSTS else None
    enough = now[1] >= AIM
    fits: list[Fit] = []
    if not enough:
        beside = _smallest(circuit, ambients_degC, short, None)
        fits += [beside] if beside is not None else []
        if dearest is not None and dearest.part == costs and not dearest.base_stop:
            fits += _instead(circuit, ambients_degC, short, dearest)
    if delay:
        step = _step(circuit, ambients_degC, short) if step is None else step
        fits = [replace(fit, step=_step(fitted(circuit, fit), ambients_degC, short)) for fit in fits]
    return Advice(*now, enough, effects, costs, tuple(fits), step)


def elsewhere(
    circuit: Circuit, ambients_degC: tuple[float, float, float], place: str, *, short: str | None = None
) -> Iterator[Fit]:
    """Yield, for each of the other usual places, the smallest capacitor there that reaches the aim, with the step then."""
    for other in places(circuit):
        found = _smallest(circuit, ambients_degC, short, None, only=other) if other != place else None
        if found is not None:
            yield replace(found, step=_step(fitted(circuit, found), ambients_degC, short))


def _instead(
    circuit: Circuit, ambients_degC: tuple[float, float, float], short: str | None, dearest: Effect
) -> Iterator[Fit]:
    """Yield what to do without the capacitor that costs the most: nothing where that is enough, else what to fit then."""
    if dearest.worst_damping >= AIM:
        yield Fit("", ("", ""), None, dearest.part, dearest.own_damping, dearest.worst_damping)
        return
    found = _smallest(_without(circuit, dearest.part), ambients_degC, short, dearest.part)
    if found is not None:
        yield found


def fitted(circuit: Circuit, fit: Fit) -> Circuit:
    """Return the circuit with what is advised done to it."""
    if fit.instead_of is not None:
        circuit = _without(circuit, fit.instead_of)
    return circuit if fit.farad is None else _with(circuit, fit.nodes, fit.farad)


def places(circuit: Circuit) -> dict[str, tuple[str, str]]:
    """Return the usual places of a compensation capacitor by name, as pairs of nodes."""
    shunt = next((one for one in circuit.devices if one.name in circuit.shunt), None)
    if shunt is None:
        return {}
    upper, lower = shunt.nodes[0], shunt.nodes[-1]
    found = {DRIVE_FAR: (_beyond_steering(circuit, upper, shunt.name), _far_end(circuit, lower))}
    if shunt.kind in WITH_CONTROL:
        base = shunt.nodes[1]
        found = {COLLECTOR_BASE: (upper, base), **found, BASE_EMITTER: (base, lower)}
    held = {*circuit.held, circuit.output, circuit.drive.node}
    return {name: (a, b) for name, (a, b) in found.items() if a != b and not {a, b} <= held}


def _figures(loop: Loop) -> tuple[float, float]:
    """Return the damping of the limiter's own modes, nominal and worst."""
    own = 1.0 if loop.own_damping is None else loop.own_damping
    return own, own if loop.worst_damping is None else loop.worst_damping


def _effects(circuit: Circuit, ambients_degC: tuple[float, float, float], short: str | None) -> Iterator[Effect]:
    changed = [(one.name, False, _without(circuit, one.name)) for one in circuit.devices if one.kind == "capacitor"]
    stop = base_stop(circuit)
    if stop is not None:
        bridged = tuple(replace(one, model={"R": LINK_OHM}) if one is stop else one for one in circuit.devices)
        changed.append((stop.name, True, replace(circuit, devices=bridged)))
    for name, is_stop, without in changed:
        loop = solve_loop(without, ambients_degC, short=short)
        if isinstance(loop, Loop):
            yield Effect(name, is_stop, *_figures(loop))


def base_stop(circuit: Circuit) -> Device | None:
    """Return the resistor between the shunt's control terminal and the sense resistance, None where there is none."""
    shunt = next((one for one in circuit.devices if one.name in circuit.shunt and one.kind in WITH_CONTROL), None)
    if shunt is None:
        return None
    watched = {node for one in circuit.devices if one.name in circuit.sense for node in one.nodes} - {shunt.nodes[2]}
    return next(
        (
            one
            for one in circuit.devices
            if one.kind == "resistor" and shunt.nodes[1] in one.nodes and watched & set(one.nodes) - {shunt.nodes[1]}
        ),
        None,
    )


def _sets_the_limit(circuit: Circuit) -> bool:
    """Tell whether the base stop is also a leg of a divider, which sets the limit: without it there is another limiter."""
    stop = base_stop(circuit)
    shunt = next((one for one in circuit.devices if one.name in circuit.shunt and one.kind in WITH_CONTROL), None)
    return shunt is not None and any(
        one.kind == "resistor" and one is not stop and shunt.nodes[1] in one.nodes for one in circuit.devices
    )


def _smallest(
    circuit: Circuit,
    ambients_degC: tuple[float, float, float],
    short: str | None,
    instead_of: str | None,
    *,
    only: str | None = None,
) -> Fit | None:
    """Return the smallest capacitor that reaches the aim, the usual places (or the ``only`` one) in turn for each value."""
    try:
        bench = [trial for trial in _bench(circuit, ambients_degC, short) if only in (None, trial.place)]
    except CircuitError:
        return None
    for farad in within(LEAST_F, GREATEST_F, SERIES):
        for trial in bench:
            found = _tried(trial, farad)
            if found is not None:
                return Fit(trial.place, trial.nodes, farad, instead_of, *found)
    return None


@dataclass(frozen=True, slots=True)
class _Trial:
    """One place with a capacitor at it, ready for any value: ``known`` collects where smaller ones failed, each a scene and
    the inductance in the short, the latest last."""

    place: str
    nodes: tuple[str, str]
    held: Held
    expanded: Expanded
    opening: Scene
    ambients_degC: tuple[float, float, float]
    known: list[tuple[Scene, float]]


def _bench(circuit: Circuit, ambients_degC: tuple[float, float, float], short: str | None) -> list[_Trial]:
    """Return the places to try; capacitors move no operating point, so all share one solved scene."""
    held = hold(compile_network(circuit), ambients_degC, short)
    found: list[_Trial] = []
    opening: Scene | None = None
    for name, nodes in places(circuit).items():
        expanded = expand(compile_network(_with(circuit, nodes, LEAST_F)), output="wired")
        if opening is None:
            opening = opening_scene(make_scope(held.stage, expanded, ambients_degC), held.short.operating.inner)
        found.append(_Trial(name, nodes, held, expanded, opening, ambients_degC, []))
    return found


def _tried(trial: _Trial, farad: float) -> tuple[float, float] | None:
    """Return nominal and worst damping with a value where the worst reaches the aim, else None.

    Cheap questions first: the nominal circuit, then the places where smaller values failed.
    """
    passive = tuple(replace(one, model={"C": farad}) if one.name == ADVISED else one for one in trial.expanded.passive)
    expanded = replace(trial.expanded, passive=passive)
    nominal = linearise(expanded, look(expanded, trial.held.short, np.array([USUAL])))
    s = wired_frequencies(nominal, 0.0)
    own = float(damping(s[counting(nominal, 0.0, s)]).min(initial=1.0))
    if own < AIM:
        return None
    scope = make_scope(trial.held.stage, expanded, trial.ambients_degC)
    if any(damping_at(scope, scene, wiring_H) < AIM for scene, wiring_H in reversed(trial.known)):
        return None
    worst = min(find_worst(scope, trial.opening), key=lambda one: one.damping)
    if worst.damping < AIM:
        scene = scene_at(scope, worst, trial.held.short.operating.inner)
        trial.known.append((scene, worst.wiring_H or 0.0))
        return None
    return own, worst.damping


def _far_end(circuit: Circuit, lower: str) -> str:
    """Return the end of the first sense resistance that no pass device has, or the shunt's own lower terminal."""
    terminals = {node for one in circuit.devices if one.name in circuit.pass_devices for node in one.nodes}
    sense = next((one for one in circuit.devices if one.name in circuit.sense), None)
    far = [] if sense is None or lower in sense.nodes else [node for node in sense.nodes if node not in terminals]
    return far[0] if len(far) == 1 else lower


def _beyond_steering(circuit: Circuit, node: str, shunt: str) -> str:
    """Return the drive's node: beyond a diode that alone joins the shunt's collector to it, else the node itself."""
    others = [one for one in circuit.devices if node in one.nodes and one.name != shunt and one.kind != "capacitor"]
    if len(others) == 1 and others[0].kind == "diode":
        return next(end for end in others[0].nodes if end != node)
    return node


def _with(circuit: Circuit, nodes: tuple[str, str], farad: float) -> Circuit:
    return replace(circuit, devices=(*circuit.devices, Device(ADVISED, "capacitor", nodes, {"C": farad})))


def _without(circuit: Circuit, name: str) -> Circuit:
    return replace(circuit, devices=tuple(one for one in circuit.devices if one.name != name))


def _step(circuit: Circuit, ambients_degC: tuple[float, float, float], short: str | None) -> Step | None:
    found = solve_step(circuit, ambients_degC, short=short)
    return found if isinstance(found, Step) else None
