"""Of several explanations of what is wrong around one shunt, the one that is told."""

from __future__ import annotations

from collections.abc import Sequence

from protlint.topology.index import Index
from protlint.topology.likely import CONTROLS, is_likely
from protlint.topology.limiter import FaultMatch


def settled(faults: Sequence[FaultMatch], tried: Sequence[FaultMatch], index: Index) -> tuple[FaultMatch, ...]:
    """Return the faults to tell, each transistor in one at most, in board order of what is wrong.

    ``faults`` are those of fault rules and ``tried`` what trying found, transistors that stand turned round or have a pin
    astray, the best explanation first. Where several explain a group the likelier counts, and of those that are alike what
    takes no connection to another net, then the base that left a resistor hanging, then what a rule says. A pin is astray
    only where all else is likely.
    """
    turned = [fault for fault in tried if fault.turned is not None]
    astray = [fault for fault in tried if fault.turned is None and is_likely(fault.group, index)]
    bases = [fault for fault in astray if all(pin in CONTROLS for (_, pin), _ in fault.moves)]
    ranked = sorted(
        [
            (not is_likely(fault.group, index, fault.turned), fault.turned is None, place, fault)
            for place, fault in enumerate((*turned, *bases, *faults, *astray))
        ],
        key=lambda one: one[:3],
    )
    chosen: list[FaultMatch] = []
    taken: set[str] = set()
    for *_, fault in ranked:
        own = {part for role in ("pass", "driver", "shunt") for part in fault.group.roles[role]}
        wrong = own if fault.turned is None else own | {fault.turned}
        if taken.isdisjoint({fault.turned} if fault.beside else wrong):
            taken |= {str(fault.turned)} if fault.beside else wrong
            chosen.append(fault)
    place_of = {part.id: part.index for part in index.board.parts}
    return tuple(sorted(chosen, key=lambda one: place_of[one.turned or one.group.roles["shunt"][0]]))
