"""Other people's readers and other people's files.

SpyDrNet (BSD 3-Clause, Brigham Young University) is an independent reader of EDIF netlists; it knows no ``designator``, so
the fixtures it reads go by their instances' names. The files of real-edif were exported by logic-synthesis programs; the
counts were made by two independent readings, see the README beside them.
"""

from __future__ import annotations

import gzip
from pathlib import Path
from typing import Any

import pytest

from protlint.netlist import read_netlist, read_netlist_bytes
from tests.support.paths import FIXTURES, SHARED
from tests.support.twins import connections

spydrnet = pytest.importorskip("spydrnet", reason="SpyDrNet is not installed: no independent reader to compare with")

REAL = SHARED / "real-edif"
COUNTS = {
    "b13": (102, 488),
    "namespace": (0, 0),
    "large-integer": (26, 133),
    "multi-port": (8, 21),
    "unique-challenge": (95, 243),
    "zpu4": (738, 4956),
    "8051": (2796, 15282),
    "aes": (24490, 128298),
}
"""File to leaf parts and connected leaf pins, as counted in the README of real-edif."""


def spydrnet_connections(path: Path) -> tuple[set[str], set[frozenset[str]]]:
    """Leaf instances, and the pins that are one node, by walking SpyDrNet's hierarchy wire by wire."""
    netlist = spydrnet.parse(str(path))
    parents: dict[Any, Any] = {}

    def root(key: Any) -> Any:
        while parents.setdefault(key, key) != key:
            key = parents[key]
        return key

    leaves: set[str] = set()
    pins: dict[Any, str] = {}
    work = [("", netlist.top_instance.reference)]
    while work:
        path_here, definition = work.pop()
        for instance in definition.children:
            name = path_here + instance.name
            if instance.reference.is_leaf():
                leaves.add(name)
            else:
                work.append((f"{name}/", instance.reference))
        for cable in definition.cables:
            for wire in cable.wires:
                node = (path_here, wire)
                root(node)
                for pin in wire.pins:
                    if not isinstance(pin, spydrnet.OuterPin):
                        continue
                    name = path_here + pin.instance.name
                    inner = pin.inner_pin
                    if pin.instance.reference.is_leaf():
                        port = inner.port
                        element = f"[{port.pins.index(inner)}]" if len(port.pins) > 1 else ""
                        pins[(name, inner)] = f"{name}.{port.name}{element}"
                        parents[root((name, inner))] = root(node)
                    elif inner.wire is not None:
                        parents[root((f"{name}/", inner.wire))] = root(node)
    nets: dict[Any, set[str]] = {}
    for key, told in pins.items():
        nets.setdefault(root(key), set()).add(told)
    return leaves, {frozenset(net) for net in nets.values()}


@pytest.mark.filterwarnings("ignore")
@pytest.mark.parametrize("name", ["flat-instances", "hierarchy-instances"])
def test_spydrnet_finds_the_same_parts_and_connections(name: str) -> None:
    path = FIXTURES / "netlist" / "valid" / f"{name}.edf"
    leaves, nets = spydrnet_connections(path)
    netlist = read_netlist(path)
    assert {part.id for part in netlist.parts} == leaves
    assert connections(netlist) == nets
    assert sum(map(len, nets)) >= 10


@pytest.mark.skipif(not REAL.is_dir(), reason=f"SKIPPED LOUDLY: no folder {REAL}, so the real files were not read")
@pytest.mark.parametrize("name", COUNTS)
def test_real_files_hold_what_was_counted(name: str) -> None:
    data = gzip.decompress((REAL / f"{name}.edf.gz").read_bytes())
    netlist = read_netlist_bytes(data, f"{name}.edf")
    pins = {(index, pin.name) for index, part in enumerate(netlist.parts) for pin in part.pins}
    assert (len(netlist.parts), len(pins)) == COUNTS[name]
    assert sum(len(part.pins) for part in netlist.parts) == len(pins)
    assert not netlist.warnings


@pytest.mark.filterwarnings("ignore")
@pytest.mark.skipif(not REAL.is_dir(), reason=f"SKIPPED LOUDLY: no folder {REAL}, so the real files were not read")
@pytest.mark.parametrize("name", ["b13", "multi-port", "unique-challenge"])
def test_spydrnet_finds_the_same_connections_in_real_files(name: str, tmp_path: Path) -> None:
    path = tmp_path / f"{name}.edf"
    path.write_bytes(gzip.decompress((REAL / f"{name}.edf.gz").read_bytes()))
    leaves, nets = spydrnet_connections(path)
    netlist = read_netlist(path)
    assert {part.id for part in netlist.parts} == leaves
    assert connections(netlist) == nets
