"""Changes to a netlist, as somebody would draw them: connections moved, parts exchanged for others, links added."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace

from protlint.netlist.model import Net, Netlist, Part, Pin

POLARITY = {
    "NPN": "PNP", "BJT_NPN": "BJT_PNP", "NPN_DARLINGTON": "PNP_DARLINGTON", "DARLINGTON_NPN": "DARLINGTON_PNP",
    "NMOS": "PMOS", "MOSFET_N": "MOSFET_P", "2N3904": "2N3906", "TIP41C": "TIP42C", "TIP122": "TIP127",
    "IRF540N": "IRF9540N",
}  # fmt: skip
OTHER = {**POLARITY, **{other: one for one, other in POLARITY.items()}}


def rebuilt(netlist: Netlist, parts: Iterable[Part], names: Sequence[str]) -> Netlist:
    """Return a netlist of changed parts; the net numbers in their pins count over ``names``."""
    parts = tuple(parts)
    pins: list[list[tuple[int, int]]] = [[] for _ in names]
    for index, part in enumerate(parts):
        for place, pin in enumerate(part.pins):
            pins[pin.net].append((index, place))
    nets = tuple(Net(name, tuple(on), 1, 1) for name, on in zip(names, pins, strict=True))
    return replace(netlist, parts=parts, nets=nets)


def changed(netlist: Netlist, part: str, change: Callable[[Part], Part], new_nets: Iterable[str] = ()) -> Netlist:
    """Return the netlist with one part changed; ``new_nets`` are numbered on from the nets there are."""
    parts = [change(one) if one.id == part else one for one in netlist.parts]
    return rebuilt(netlist, parts, [net.name for net in netlist.nets] + list(new_nets))


def is_role(pin: Pin, role: str) -> bool:
    """Tell whether a pin of these fixtures has a role: its name is the role's, or begins like it."""
    letters = "kc" if role == "cathode" else role[0]
    return pin.name == role or (not role.isdigit() and pin.name[0].lower() in letters)


def net_of(netlist: Netlist, part: str, role: str) -> str:
    found = next(one for one in netlist.parts if one.id == part)
    return netlist.nets[next(pin.net for pin in found.pins if is_role(pin, role))].name


def moved(netlist: Netlist, part: str, role: str, net: str) -> Netlist:
    """Return the netlist with one connection on another net, a new one if need be."""
    names = [one.name for one in netlist.nets]
    target = names.index(net) if net in names else len(names)

    def change(one: Part) -> Part:
        pins = tuple(pin._replace(net=target) if is_role(pin, role) else pin for pin in one.pins)
        return one._replace(pins=pins)

    return changed(netlist, part, change, () if net in names else (net,))


def exchanged(netlist: Netlist, one: tuple[str, str], other: tuple[str, str]) -> Netlist:
    """Return the netlist with two connections exchanged."""
    first, second = net_of(netlist, *one), net_of(netlist, *other)
    return moved(moved(netlist, *one, second), *other, first)


def other_polarity(netlist: Netlist, part: str) -> Netlist:
    """Return the netlist with a transistor of the other polarity in a part's place; of a type without a known complement
    the number goes, which would tell the polarity against the cell."""

    def change(one: Part) -> Part:
        properties = {
            key: item._replace(value=OTHER.get(str(item.value), item.value))
            for key, item in one.properties.items()
            if str(item.value) in OTHER
        }
        return one._replace(cell=OTHER[one.cell], properties=properties)

    return changed(netlist, part, change)


def with_link(netlist: Netlist, one: str, other: str, name: str = "W99") -> Netlist:
    """Return the netlist with a link between two nets."""
    names = [net.name for net in netlist.nets]
    pins = tuple(Pin(str(place), None, names.index(net)) for place, net in enumerate((one, other), 1))
    return rebuilt(netlist, (*netlist.parts, Part(name, name, "NET_TIE", "PARTS", {}, pins, 1, 1)), names)


def without(netlist: Netlist, parts: Iterable[str]) -> Netlist:
    """Return the netlist without some parts."""
    gone = set(parts)
    return rebuilt(netlist, (one for one in netlist.parts if one.id not in gone), [net.name for net in netlist.nets])


def twice(netlist: Netlist, shared: Callable[[str], bool]) -> Netlist:
    """Return a board that holds everything twice, as A/... and B/...; nets are shared where ``shared`` says so."""
    names: list[str] = []
    parts = []
    for copy in "AB":
        numbers = {}
        for index, net in enumerate(netlist.nets):
            name = net.name if shared(net.name) else f"{copy}/{net.name}"
            if name not in names:
                names.append(name)
            numbers[index] = names.index(name)
        for part in netlist.parts:
            pins = tuple(pin._replace(net=numbers[pin.net]) for pin in part.pins)
            parts.append(part._replace(id=f"{copy}/{part.id}", pins=pins))
    return rebuilt(netlist, parts, names)
