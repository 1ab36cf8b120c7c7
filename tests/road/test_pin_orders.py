"""A pin order that protlint has from memory: what rests on it says so, is no error, and is asked about."""

from __future__ import annotations

from pathlib import Path

import pytest

from protlint.netlist import read_netlist_bytes
from protlint.pipeline import Review, review_netlist, set_up
from protlint.report.document import document
from protlint.report.skeleton import rendered_skeleton
from tests.support.edif_text import Drawn, flat_netlist

MEMORY = {"1": "collector", "2": "base", "3": "emitter"}
"""BC547B, TO-92; from memory, and so it stands in protlint's own part data."""


def reviewed(shunt: dict[str, str], limits: str | None = None) -> Review:
    """Review a limiter whose shunt's pins are numbered; ``shunt`` tells which net the pins of a role are on."""
    pins = tuple((number, shunt[role]) for number, role in MEMORY.items())
    parts = (
        Drawn("Q10", "NPN", (("B", "DRV"), ("C", "+24V"), ("E", "SNS")), value="TIP41C"),
        Drawn("R11", "RES", (("1", "SNS"), ("2", "OUT")), value="1R", power="2W"),
        Drawn("Q11", "SMALL", pins, value="BC547B"),
        Drawn("R12", "RES", (("1", "SNS"), ("2", "TAP")), value="220R"),
        Drawn("R10", "RES", (("1", "+24V"), ("2", "DRV")), value="1K5"),
        Drawn("J10", "CON2", (("1", "OUT"), ("2", "GND"))),
    )
    data = flat_netlist("orders", parts, remark="invented").encode()
    return review_netlist(read_netlist_bytes(data, "orders.edf"), set_up(limits=limits))


def test_a_sound_limiter_says_whose_pin_order_is_from_memory() -> None:
    review = reviewed({"collector": "DRV", "base": "TAP", "emitter": "OUT"})
    (limiter,) = document(review)["limiters"]
    remembered = {part["id"] for part in limiter["parts"] if "pin order" in part["from_memory"]}
    assert remembered == {"Q11"}


@pytest.mark.parametrize("confirmed", [False, True])
def test_a_fault_is_an_error_only_where_the_pin_order_is_known(tmp_path: Path, confirmed: bool) -> None:
    path = tmp_path / "limits.toml"
    path.write_text('[pins.BC547B]\n1 = "collector"\n2 = "base"\n3 = "emitter"\n', encoding="utf-8")
    review = reviewed({"collector": "TAP", "base": "DRV", "emitter": "OUT"}, str(path) if confirmed else None)
    (finding,) = (one for one in review.findings if "Q11" in one.parts)
    assert (finding.level, finding.assumption) == (("error", False) if confirmed else ("warning", True))
    assert ("from memory" in finding.message) is not confirmed


def test_the_skeleton_asks_about_it() -> None:
    asked = rendered_skeleton(reviewed({"collector": "TAP", "base": "DRV", "emitter": "OUT"})).partition("# [pins.BC547B]")[
        2
    ]
    assert asked.splitlines()[1:4] == ['# 1 = "collector"', '# 2 = "base"', '# 3 = "emitter"']


def test_the_skeleton_has_blanks_for_pins_that_nobody_knows(tmp_path: Path) -> None:
    drawn = flat_netlist(
        "unknown", (Drawn("Q1", "NPN", (("1", "A"), ("2", "B"), ("3", "C")), value="XYZ9"),), remark="invented"
    )
    netlist = read_netlist_bytes(drawn.encode(), "unknown.edf")
    skeleton = rendered_skeleton(review_netlist(netlist, set_up()))
    assert '# [pins.XYZ9]\n# 1 = ""\n# 2 = ""\n# 3 = ""\n' in skeleton
    assert "XYZ7" not in skeleton
    path = tmp_path / "limits.toml"
    blanks, roles = '# 1 = ""\n# 2 = ""\n# 3 = ""', '1 = "base"\n2 = "emitter"\n3 = "collector"'
    path.write_text(skeleton.replace("# [pins.XYZ9]", "[pins.XYZ9]").replace(blanks, roles), encoding="utf-8")
    answered = review_netlist(netlist, set_up(limits=path))
    assert set(answered.board.parts[0].roles) == {"base", "emitter", "collector"}
    assert "# [pins" not in rendered_skeleton(answered)
