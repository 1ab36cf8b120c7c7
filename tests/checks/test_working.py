"""What stands in the working is what comes out: every line that is arithmetic with units is worked out again by itself."""

from __future__ import annotations

import ast
import math
import operator
import re
from collections.abc import Iterator

import pytest

from protlint.checks.catalogue import load_catalogue
from protlint.findings import Finding, WorkingLine
from tests.checks.test_dropped_tables import BOARDS, reviewed

PREFIX = {"": 1.0, "p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "k": 1e3, "M": 1e6}
QUANTITY = re.compile(r"(\d+(?:\.\d+)?(?:e[+-]?\d+)?)(?: ([pnumkM]?)(K/W|degC|ohm|Hz|A|V|W|F|s|H)(?![A-Za-z/]))?")
SIGNS = {
    ast.Add: operator.add,
    ast.Sub: operator.sub,
    ast.Mult: operator.mul,
    ast.Div: operator.truediv,
    ast.Pow: operator.pow,
}


def worked_out(formula: str) -> float | None:
    """Return what a formula of numbers with units gives in SI units, or None where it is none."""
    plain = QUANTITY.sub(lambda found: repr(float(found[1]) * PREFIX[found[2] or ""]), formula).replace("^", "**")
    if re.search(r"[^-+*/(). \de]", plain) or not re.search(r"[-+*/]", plain):
        return None
    try:
        return _value(ast.parse(plain, mode="eval").body)
    except SyntaxError:
        return None


def _value(node: ast.expr) -> float:
    if isinstance(node, ast.BinOp):
        return float(SIGNS[type(node.op)](_value(node.left), _value(node.right)))
    if isinstance(node, ast.UnaryOp):
        return -_value(node.operand)
    assert isinstance(node, ast.Constant)
    return float(node.value)


def lines() -> Iterator[tuple[Finding, WorkingLine, float]]:
    for board in BOARDS:
        for finding in reviewed(board).findings:
            for line in finding.working:
                value = worked_out(line.formula)
                if value is not None and line.value is not None:
                    yield finding, line, value


def test_it_reads_what_people_write() -> None:
    assert worked_out("(0.37 A)^2 * 2.2 ohm") == pytest.approx(0.301, abs=1e-3)
    assert worked_out("70 degC + 3.94 W * 8 K/W") == pytest.approx(101.52)
    assert worked_out("(2.77 V - 800 mV) / (102 ohm + 10 ohm)") == pytest.approx(17.6e-3, rel=1e-3)
    assert worked_out("solved in the held short") is None


def test_every_line_of_arithmetic_gives_the_figure_beside_it() -> None:
    """Within what figures of three digits leave open."""
    wrong, checks = [], set()
    for finding, line, value in lines():
        checks.add(finding.check)
        if not math.isclose(value, line.value or 0.0, rel_tol=0.02):
            wrong.append((finding.check, line.quantity, line.formula, line.value, value))
    assert wrong == []
    assert checks >= {
        "base-stop-absent", "base-stop-low", "base-stop-high", "sense-resistor-power", "resistor-power", "drive-unlimited",
        "driver-overloaded", "pass-overheated", "pass-outside-safe-area",
    }  # fmt: skip
    assert checks <= set(load_catalogue())
