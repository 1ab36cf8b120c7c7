"""Parts of every kind with nothing on their pins, as spare ones stand on real boards: a review takes them as they are."""

from __future__ import annotations

from dataclasses import replace

from protlint.netlist import read_netlist
from protlint.netlist.model import Part
from protlint.pipeline import review_netlist, set_up
from protlint.report.skeleton import rendered_skeleton
from protlint.report.survey import survey
from protlint.report.survey_text import rendered_survey
from tests.support.paths import FIXTURES
from tests.support.placed import placed

SPARE = (
    ("F90", "FUSE", ""), ("R90", "RES", "0.1"), ("R91", "RES", "0"), ("R92", "RES", "4K7"), ("C90", "CAP", "100n"),
    ("L90", "IND", "10uH"), ("D90", "DIODE", "1N4148"), ("D91", "ZENER", "5V1"), ("Q90", "NPN", "BC547B"),
    ("Q91", "NMOS", ""), ("Q92", "SCR", ""), ("Q93", "NPN_DARLINGTON", ""), ("U90", "LM358", ""), ("J90", "CON2", ""),
    ("TP90", "TESTPOINT", ""), ("W90", "JUMPER", ""), ("X90", "THING", ""),
)  # fmt: skip


def spare(name: str, cell: str, value: str) -> Part:
    return placed(name, cell, (), {"VALUE": value} if value else {})


def test_spare_parts_change_nothing() -> None:
    netlist = read_netlist(FIXTURES / "circuits" / "sink-npn.edf")
    more = replace(netlist, parts=(*netlist.parts, *(spare(*row) for row in SPARE)))
    desk = set_up()
    plain, crowded = review_netlist(netlist, desk), review_netlist(more, desk)
    assert [limiter.limiter.id for limiter in crowded.limiters] == [limiter.limiter.id for limiter in plain.limiters]
    assert [(one.check, one.parts) for one in crowded.findings] == [(one.check, one.parts) for one in plain.findings]
    assert rendered_survey(survey(crowded))
    assert rendered_skeleton(crowded)
