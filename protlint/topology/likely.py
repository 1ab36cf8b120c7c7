"""Which way the load current of a limiter could flow at all, and where its load and its drive are to be looked for."""

from __future__ import annotations

from protlint.topology.index import Index
from protlint.topology.limiter import Limiter
from protlint.topology.questions import leaves

CONTROLS = ("base", "gate")


def is_likely(limiter: Limiter, index: Index, turned: str | None = None) -> bool:
    """Tell whether supplies and connectors stand where such a limiter has them.

    The current of the N kind flows from the load side to the far end, so the load side cannot be the lower supply of the
    two, nor a far end the highest supply, nor a load side the lowest; in the mirror the other way round. And the load, not
    the drive, is what leaves the board; nor does a supply drive any device, ``turned`` perhaps, which is to stand otherwise.
    """
    bound = {name: index.net_of[net] for name, net in limiter.bound.items()}
    load, far, drive = (bound.get(name) for name in ("load", "far", "drive"))
    if is_driven_by_supply(limiter, index, turned) or _against_the_supplies(limiter.polarity, load, far, index):
        return False
    drive_leaves, load_leaves = (net is not None and leaves(net, index) for net in (drive, load))
    return load in index.voltage_V or load_leaves or not drive_leaves


def runs_against_supplies(limiter: Limiter, index: Index) -> bool:
    """Tell whether the current of a limiter would have to flow from a lower supply to a higher one.

    Only what is certain counts: both ends of the path are on supplies, or one is and the rule says that the load lies
    between the other and ground, which is where the current comes from or goes to.
    """
    load_V, far_V = (_end_V(limiter, name, index) for name in ("load", "far"))
    if load_V is None or far_V is None:
        return False
    return load_V < far_V if limiter.polarity == "n" else load_V > far_V


def is_driven_by_supply(limiter: Limiter, index: Index, turned: str | None = None) -> bool:
    """Tell whether a supply is on the control of a pass device or driver, but for one that is to stand otherwise."""
    board = index.board
    devices = {one for role, ones in limiter.elements.items() if role.split(".")[0] in ("pass", "driver") for one in ones}
    others = (one for one in devices if turned not in {board.parts[part].id for part in board.elements[one].parts})
    return any(index.terminals[one].get(pin) in index.voltage_V for one in others for pin in CONTROLS)


def _end_V(limiter: Limiter, name: str, index: Index) -> float | None:
    """Return the voltage that the path of a limiter's current ends at, behind the load where the rule says so."""
    net = limiter.bound.get(name)
    stated_V = None if net is None else index.voltage_V.get(index.net_of[net])
    return 0.0 if stated_V is None and name in limiter.grounded else stated_V


def _against_the_supplies(polarity: str, load: int | None, far: int | None, index: Index) -> bool:
    load_V, far_V = (None if net is None else index.voltage_V.get(net) for net in (load, far))
    sign = 1.0 if polarity == "n" else -1.0
    first_V, last_V = (index.lowest_V, index.highest_V) if sign > 0.0 else (index.highest_V, index.lowest_V)
    if load_V is not None and far_V is not None:
        return sign * (load_V - far_V) <= 0.0
    return first_V != last_V and ((load_V is None and far_V == last_V) or (far_V is None and load_V == first_V))
