"""Walks a plan over a board with a stack of its own, and hands out every match."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from protlint.topology.index import CROWDED, Index
from protlint.topology.plan import NEW, AskStep, BridgeStep, Entry, Node, PartStep, PathStep, Planner, Step
from protlint.topology.questions import holds

Elements = tuple[int, ...]


@dataclass(frozen=True, slots=True)
class State:
    """A partial match: nets by slot, the elements of each clause found, every element used, nets inside paths."""

    nets: tuple[int, ...]
    found: tuple[Elements, ...] = ()
    used: Elements = ()
    inside: tuple[int, ...] = ()


Growth = tuple[tuple[int, ...], Elements, tuple[int, ...]]
"""What a step adds: nets newly bound, elements found, nets inside the path found."""


def search(index: Index, planner: Planner, node: Node, state: State) -> Iterator[tuple[Entry, State]]:
    """Yield every fulfilled task with its state, from a node of the plan onward."""
    stack = [(node, state)]
    flag = index.flag
    while stack:
        node, state = stack.pop()
        for entry in node.done:
            yield entry, state
        for step, (entries, children) in node.branches.items():
            for nets, elements, inside in _grow(step, state, index):
                flags = tuple(flag[net] for net in nets)
                child = children.get(flags)
                if child is None:
                    before = tuple(flag[net] for net in state.nets)
                    child = children[flags] = planner.node(entries, before + flags)
                if not child.done and not child.branches:
                    continue
                if isinstance(step, AskStep):
                    stack.append((child, state))
                    continue
                grown = State(state.nets + nets, (*state.found, elements), state.used + elements, state.inside + inside)
                stack.append((child, grown))


def _grow(step: Step, state: State, index: Index) -> Sequence[Growth] | Iterator[Growth]:
    if isinstance(step, PartStep):
        return _parts(step, state, index)
    if isinstance(step, BridgeStep):
        return _bridges(step, state, index)
    if isinstance(step, PathStep):
        return _paths(step, state, index)
    nets = {str(slot): net for slot, net in enumerate(state.nets)}
    return [((), (), ())] if holds(step.test, nets, index) else []


def _candidates(index: Index, net: int, kinds: tuple[str, ...], pin: str) -> Sequence[int]:
    on_net = index.at[net]
    if len(on_net) <= CROWDED:
        kind = index.kind
        return [element for element, role in on_net if role == pin and kind[element] in kinds]
    return [element for kind in kinds for element in index.on_pin(net, kind, pin)]


def _parts(step: PartStep, state: State, index: Index) -> Iterator[Growth]:
    terminals, nets = index.terminals, state.nets
    elements: Sequence[int]
    if step.known:
        pin, slot = min(step.known, key=lambda pair: len(index.at[nets[pair[1]]])) if len(step.known) > 1 else step.known[0]
        elements = _candidates(index, nets[slot], step.kinds, pin)
    else:
        elements = [element for kind in step.kinds for element in index.by_kind.get(kind, ())]
    for element in elements:
        if element in state.used:
            continue
        roles = terminals[element]
        grown = nets
        for pin, apart in step.new:
            net = roles.get(pin)
            if net is None or net in state.inside or any(grown[slot] == net for slot in apart):
                break
            grown = (*grown, net)
        else:
            if all(roles.get(pin) == grown[slot] for pin, slot in step.known):
                yield grown[len(nets) :], (element,), ()


def _ends(roles: Mapping[str, int]) -> tuple[int, int] | None:
    """Return the two nets of a two-terminal element, anode first."""
    if len(roles) != 2:
        return None
    if "anode" in roles and "cathode" in roles:
        return roles["anode"], roles["cathode"]
    first, second = roles.values()
    return first, second


def _bridges(step: BridgeStep, state: State, index: Index) -> Iterator[Growth]:
    nets = state.nets
    known = [nets[slot] for slot in (step.a, step.b) if slot != NEW]
    elements: Sequence[int]
    if known:
        start = min(known, key=lambda net: len(index.at[net]))
        elements = list(dict.fromkeys(_on_net(index, start, step.kinds)))
    else:
        elements = [element for kind in step.kinds for element in index.by_kind.get(kind, ())]
    values = index.board.elements
    for element in elements:
        if element in state.used:
            continue
        ends = _ends(index.terminals[element])
        if ends is None:
            continue
        if step.under_ohm is not None:
            value = values[element].value
            if value is not None and not 0.0 < value < step.under_ohm:
                continue
        turned = () if step.directed or ends[0] == ends[1] else (ends[::-1],)
        for pair in (ends, *turned):
            grown = nets
            aparts = iter(step.apart)
            for slot, net in zip((step.a, step.b), pair, strict=True):
                if slot != NEW:
                    if nets[slot] != net:
                        break
                elif net in state.inside or any(grown[one] == net for one in next(aparts)):
                    break
                else:
                    grown = (*grown, net)
            else:
                yield grown[len(nets) :], (element,), ()


def _on_net(index: Index, net: int, kinds: tuple[str, ...]) -> Sequence[int]:
    on_net = index.at[net]
    if len(on_net) <= CROWDED:
        kind = index.kind
        return [element for element, _ in on_net if kind[element] in kinds]
    pins = ("1", "2", "anode", "cathode")
    return [element for kind in kinds for pin in pins for element in index.on_pin(net, kind, pin)]


@dataclass(frozen=True, slots=True)
class _Way:
    """A way walked so far: the nets passed, the start first, and the elements taken."""

    nets: tuple[int, ...]
    elements: Elements


def _paths(step: PathStep, state: State, index: Index) -> Iterator[Growth]:
    """Yield paths: the shortest that is long enough to every end, or every path where the length is fixed."""
    start = state.nets[step.a]
    target = state.nets[step.b] if step.b != NEW else None
    if step.least == 0 and (target is None or target == start):
        yield (() if target is not None else (start,)), (), ()
        if target is not None:
            return
    if target == start:
        return
    barred = {state.nets[slot] for slot in step.apart}
    bound = set(state.nets) | set(state.inside)
    every = step.least == step.most
    seen: set[tuple[int, int]] = {(start, 0)}
    ways = [_Way((start,), ())]
    for length in range(1, step.most + 1):
        further: list[_Way] = []
        for way in ways:
            for element, net in _onward(step, state, index, way):
                elements = (*way.elements, element)
                key = (net, min(length, max(step.least, 1)))
                if not every and key in seen:
                    continue
                seen.add(key)
                if net == target:
                    if length >= step.least:
                        yield (), elements, way.nets[1:]
                        if not every:
                            return
                    continue
                is_end = target is None and length >= step.least and net not in barred and net not in state.inside
                may_go_on = net not in bound and index.is_open(net)
                if step.until_driven and may_go_on:
                    goes_on = _is_joint(index, net)
                    is_end, may_go_on = is_end and not goes_on, goes_on
                if is_end:
                    yield (net,), elements, way.nets[1:]
                if may_go_on:
                    further.append(_Way((*way.nets, net), elements))
        ways = further


def _onward(step: PathStep, state: State, index: Index, way: _Way) -> Iterator[tuple[int, int]]:
    """Yield (element, net at its other end) for the elements that can be next on a way."""
    net = way.nets[-1]
    for element in _on_net(index, net, step.kinds):
        if element in state.used or element in way.elements:
            continue
        ends = _ends(index.terminals[element])
        if ends is None or ends[0] == ends[1]:
            continue
        forward = ends[0] == net
        if step.direction and forward != (step.direction > 0):
            continue
        other = ends[1] if forward else ends[0]
        if other not in way.nets:
            yield element, other


def _is_joint(index: Index, net: int) -> bool:
    """Tell whether a net holds only resistors and capacitors, two resistors or more: a joint, and no source of a drive."""
    kinds = [index.kind[element] for element, _ in index.at[net]]
    return kinds.count("resistor") > 1 and all(kind in ("resistor", "capacitor") for kind in kinds)
