"""Loop, step and advice of a solved limiter, added to its solution."""

from __future__ import annotations

from dataclasses import replace

from protlint.solve.advice import advise
from protlint.solve.circuit import Circuit
from protlint.solve.delay import solve_step
from protlint.solve.loop import solve_loop
from protlint.solve.memo import Memo
from protlint.solve.solution import Advice, Loop, Solution, Step

ADVISED_BELOW = 0.42
"""Advice costs many times what the loop does; a loop damped better gets none unless it grows somewhere."""

LATCHED = "how a latch swings and how soon it trips, which are not worked out"
"""What is not told of a limiter that trips and stays."""


def with_dynamics(
    circuit: Circuit,
    solution: Solution,
    ambients_degC: tuple[float, float, float],
    *,
    step: bool = True,
    advised: bool = True,
    memo: Memo | None = None,
) -> Solution:
    """Return a solution with its loop; unless ``advised`` is false, advice where that is badly damped; and, unless ``step``
    is false, the step into the short. Both take longer.

    Where one of them cannot be worked out, ``loop_needs`` or ``step_needs`` say what is missing; where the circuit itself
    could not be solved, or both are there already, the solution comes back as it was. With a ``memo`` that the solution came
    from, equal circuits are worked out once.
    """
    if solution.not_solved is not None:
        return solution
    complete = solution
    if circuit.latch:
        return replace(solution, loop_needs=(LATCHED,), step_needs=(LATCHED,))
    if complete.loop is None and not complete.loop_needs:
        loop = solve_loop(circuit, ambients_degC, short=solution.short)
        complete = replace(complete, loop=loop) if isinstance(loop, Loop) else replace(complete, loop_needs=_needs(loop))
    if step and complete.step is None and not complete.step_needs:
        found = solve_step(circuit, ambients_degC, short=solution.short)
        complete = replace(complete, step=found) if isinstance(found, Step) else replace(complete, step_needs=_needs(found))
    if complete.loop is not None and complete.advice is None and advised and _badly_damped(complete.loop):
        advice = advise(circuit, ambients_degC, short=solution.short, delay=step, loop=complete.loop, step=complete.step)
        complete = replace(complete, advice=advice if isinstance(advice, Advice) else None)
    # reasons name parts, so only what holds for any equal circuit is kept
    if memo is not None and not complete.loop_needs and not complete.step_needs:
        memo.keep(circuit, ambients_degC, complete)
    return complete


def _badly_damped(loop: Loop) -> bool:
    return (loop.own_damping is not None and loop.own_damping < ADVISED_BELOW) or loop.can_grow


def _needs(reason: str) -> tuple[str, ...]:
    return tuple(reason.split("; "))
