"""Walks a plan over a board with a stack of its own, and hands out every match."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import chain
from typing import NamedTuple

from protlint.topology.index import CROWDED, Index, pin_bits
from protlint.topology.plan import Node, Planner
from protlint.topology.questions import holds
from protlint.topology.steps import NEW, AskStep, BridgeStep, Entry, PartStep, PathStep, Step

Elements = tuple[int, ...]


class State(NamedTuple):
    """A partial match: nets by slot, the elements of each clause found, every element used, nets inside paths."""

    nets: tuple[int, ...]
    found: tuple[Elements, ...] = ()
    used: Elements = ()
    inside: tuple[int, ...] = ()


PASSIVE = frozenset({"resistor", "capacitor"})
"""What drives nothing: a net that holds only these is a joint on the way to what drives it."""

Growth = tuple[tuple[int, ...], Elements, tuple[int, ...]]
"""What a step adds: nets newly bound, elements found, nets inside the path found."""


def search(index: Index, planner: Planner, node: Node, state: State) -> Iterator[tuple[Entry, State]]:
    """Yield every fulfilled task with its state, from a node of the plan onward."""
    stack = [(node, state)]
    flag, mask = index.flag, index.mask
    while stack:
        node, state = stack.pop()
        for entry in node.done:
            yield entry, state
        nets, found, used, inside = state
        for step, branch in node.branches.items():
            for slot, bits in branch.needs:
                if not mask[nets[slot]] & bits:
                    break
            else:
                for new_nets, elements, passed in _GROW[type(step)](step, state, index):
                    flags = tuple([flag[net] for net in new_nets])
                    child = branch.children.get(flags)
                    if child is None:
                        before = [flag[net] for net in nets]
                        child = branch.children[flags] = planner.node(branch.entries, before, flags)
                    if not child.done and not child.branches:
                        continue
                    if type(step) is AskStep:
                        stack.append((child, state))
                    else:
                        grown = State(nets + new_nets, (*found, elements), used + elements, inside + passed)
                        stack.append((child, grown))


def _ask(step: AskStep, state: State, index: Index) -> Sequence[Growth]:
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


def _bridges(step: BridgeStep, state: State, index: Index) -> Iterator[Growth]:
    nets = state.nets
    known = [nets[slot] for slot in (step.a, step.b) if slot != NEW]
    elements: Sequence[int]
    if known:
        elements = index.between(known[0], known[-1], step.kinds)
    else:
        elements = [element for kind in step.kinds for element in index.by_kind.get(kind, ())]
    values = index.board.elements
    for element in elements:
        if element in state.used:
            continue
        ends = index.ends(element)
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


@dataclass(frozen=True, slots=True)
class _Way:
    """A way walked so far: the nets passed, the start first, and the elements taken."""

    nets: tuple[int, ...]
    elements: Elements


def _paths(step: PathStep, state: State, index: Index) -> Iterable[Growth]:
    """Return paths: the shortest that is long enough to every end, or every path where the length is fixed."""
    start = state.nets[step.a]
    target = state.nets[step.b] if step.b != NEW else None
    found: list[Growth] = []
    if step.least == 0 and target in (None, start):
        found.append((() if target is not None else (start,), (), ()))
    if target == start or step.most == 0 or not index.mask[start] & pin_bits(step.kinds):
        return found
    if step.most == 1 or (target is not None and index.flag[start] and index.flag[target]):
        # Between two crowded nets only what joins them straight is looked for: neither is walked.
        return found + _single(step, state, index, start, target)
    return chain(found, _ways(step, state, index, start, target))


def _single(step: PathStep, state: State, index: Index, start: int, target: int | None) -> list[Growth]:
    """Return what a single element makes: the one that joins start and target, or every one that leads from start."""
    if step.least > 1:
        return []
    if target is None:
        on_net = index.on_net(start, step.kinds)
        onward = _onward(step, state, index, on_net, (start,))
        return [((net,), (element,), ()) for element, net in onward if _is_free_end(net, step, state)]
    found: list[Growth] = []
    for element in index.between(start, target, step.kinds):
        ends = index.ends(element)
        joined = (ends == (start, target) and step.direction >= 0) or (ends == (target, start) and step.direction <= 0)
        if joined and element not in state.used:
            found.append(((), (element,), ()))
    return found if step.least == step.most else found[:1]


def _ways(step: PathStep, state: State, index: Index, start: int, target: int | None) -> Iterator[Growth]:
    """Walk on, breadth first, through nets that are open and not bound."""
    bound = {*state.nets, *state.inside}
    every = step.least == step.most
    seen: set[tuple[int, int]] = set()
    ways = [_Way((start,), ())]
    for length in range(1, step.most + 1):
        further: list[_Way] = []
        for way in ways:
            on_net = index.on_net(way.nets[-1], step.kinds)
            for element, net in _onward(step, state, index, on_net, way.nets):
                key = (net, min(length, max(step.least, 1)))
                if element in way.elements or (not every and key in seen):
                    continue
                seen.add(key)
                elements = (*way.elements, element)
                if net == target:
                    if length >= step.least:
                        yield (), elements, way.nets[1:]
                        if not every:
                            return
                    continue
                is_end = target is None and length >= step.least and _is_free_end(net, step, state)
                goes_on = net not in bound and index.is_open(net)
                if step.until_driven:
                    behind = [index.kind[one] for one, _ in index.at[net] if one != element]
                    goes_on = goes_on and "resistor" in behind and PASSIVE.issuperset(behind)
                    is_end = is_end and not goes_on and (not behind or set(behind) != {"capacitor"})
                if is_end:
                    yield (net,), elements, way.nets[1:]
                if goes_on:
                    further.append(_Way((*way.nets, net), elements))
        ways = further


def _is_free_end(net: int, step: PathStep, state: State) -> bool:
    return net not in state.inside and all(state.nets[slot] != net for slot in step.apart)


def _onward(
    step: PathStep, state: State, index: Index, elements: Sequence[int], passed: tuple[int, ...]
) -> Iterator[tuple[int, int]]:
    """Yield (element, net at its other end) for those of some elements that can be next at the last net passed."""
    net = passed[-1]
    for element in elements:
        if element in state.used:
            continue
        ends = index.ends(element)
        if ends is None or ends[0] == ends[1]:
            continue
        forward = ends[0] == net
        if step.direction and forward != (step.direction > 0):
            continue
        other = ends[1] if forward else ends[0]
        if other not in passed:
            yield element, other


_GROW: Mapping[type[Step], Callable[..., Iterable[Growth]]] = {
    PartStep: _parts,
    BridgeStep: _bridges,
    PathStep: _paths,
    AskStep: _ask,
}
