"""Equal circuits are solved once, whatever their names."""

from __future__ import annotations

from dataclasses import replace

import pytest

from protlint.solve import memo as memory
from protlint.solve.answers import solve
from protlint.solve.circuit import Circuit
from protlint.solve.memo import Memo
from tests.support.circuits import bench_circuit

AMBIENTS = (-10.0, 27.0, 85.0)


def called_otherwise(circuit: Circuit, prefix: str) -> Circuit:
    """The circuit with every device and every net called by another name."""

    def name(old: str) -> str:
        return f"{prefix}/{old}"

    devices = tuple(
        replace(device, name=name(device.name), nodes=tuple(name(node) for node in device.nodes))
        for device in circuit.devices
    )
    return replace(
        circuit,
        devices=devices,
        held={name(node): limits for node, limits in circuit.held.items()},
        drive=replace(circuit.drive, node=name(circuit.drive.node)),
        output=name(circuit.output),
        shorts=tuple(name(node) for node in circuit.shorts),
        shunt=tuple(name(one) for one in circuit.shunt),
        pass_devices=tuple(name(one) for one in circuit.pass_devices),
        sense=tuple(name(one) for one in circuit.sense),
        assumed=(f"assumed of {prefix}",),
    )


@pytest.mark.parametrize("name", ["sink", "foldback", "darlington_follower"])
def test_a_recalled_solution_is_the_one_that_solving_gives(name: str) -> None:
    memo = Memo()
    circuit = bench_circuit(name)
    solve(circuit, AMBIENTS, memo=memo)
    other = called_otherwise(circuit, "CH2")
    assert memo.recall(other, AMBIENTS) == solve(other, AMBIENTS, memo=memo) == solve(other, AMBIENTS)


def test_names_that_devices_and_nets_share_do_not_mix_up() -> None:
    circuit = bench_circuit("sink")
    # nets called like parts
    nets = {"BASE": "R1", "SNS": "Q2", "BS": "R3", "DRV": "Q1"}
    devices = tuple(
        replace(device, nodes=tuple(nets.get(node, node) for node in device.nodes)) for device in circuit.devices
    )
    other = replace(circuit, devices=devices, drive=replace(circuit.drive, node="Q1"))
    memo = Memo()
    solve(circuit, AMBIENTS, memo=memo)
    assert memo.recall(other, AMBIENTS) == solve(other, AMBIENTS, memo=memo) == solve(other, AMBIENTS)


def test_anything_that_matters_makes_another_circuit() -> None:
    memo = Memo()
    circuit = bench_circuit("sink")
    first = circuit.devices[1]
    solve(circuit, AMBIENTS, memo=memo)
    for other in (
        replace(circuit, devices=(circuit.devices[0], replace(first, model={"R": 1001.0}), *circuit.devices[2:])),
        replace(circuit, devices=(circuit.devices[0], replace(first, tolerance=0.05), *circuit.devices[2:])),
        replace(circuit, devices=(circuit.devices[0], replace(first, rise_K=5.0), *circuit.devices[2:])),
        replace(circuit, output_V=6.0),
        replace(circuit, drive=replace(circuit.drive, current_A=0.01)),
    ):
        assert memo.recall(other, AMBIENTS) is None
    assert memo.recall(circuit, (-10.0, 25.0, 85.0)) is None
    assert memo.recall(circuit, AMBIENTS) is not None


def test_the_memory_is_bounded(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(memory, "LARGEST", 2)
    memo = Memo()
    for output_V in (2.0, 3.0, 4.0):
        solve(replace(bench_circuit("sink"), output_V=output_V), AMBIENTS, memo=memo)
    assert len(memo.kept) == 2
    assert memo.recall(replace(bench_circuit("sink"), output_V=2.0), AMBIENTS) is None


def test_a_circuit_that_cannot_be_solved_is_not_kept() -> None:
    memo = Memo()
    circuit = replace(bench_circuit("sink"), shorts=())
    assert solve(circuit, AMBIENTS, memo=memo).not_solved is not None
    assert not memo.kept
