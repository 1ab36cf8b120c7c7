"""A review made by hand, for tests of the faces: invented boards and numbers, no electronics behind them.

``sample_review`` holds limiters that pass, fail and were not judged, a finding about the board, waived findings and
whatever names a test asks for, so that every branch of a face has something to show.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from protlint.board.graph import Board, BoardNet, BoardPart, Element, Supply, Values
from protlint.checks.load import StartUp
from protlint.checks.part_fails import IfPartFails, PartFails
from protlint.findings import Finding, NotChecked, Warning, WorkingLine, identifying_parts, stamp_fingerprints
from protlint.limits import LimiterLimits, Limits, Range
from protlint.netlist.model import Net, Netlist, Part, Pin, Property
from protlint.partdata.book import Figure, PartEntry
from protlint.pipeline import Review, ReviewedLimiter
from protlint.solve.bench import Bench
from protlint.solve.circuit import Circuit, Device, Drive
from protlint.solve.comparison import Comparison, Failing
from protlint.solve.solution import Advice, Currents, Effect, Fit, Loop, Point, Sensitivity, Solution, State, Step, Worst
from protlint.topology.limiter import ROLES, Found, Limiter

PLAIN = {"pass": "Q10", "sense": "R11", "shunt": "Q11", "base_stop": "R12", "drive": "R10", "out": "OUT", "name": "lamp.edf"}
"""The names of the first limiter's parts, its output net and the file."""

HOSTILE = (
    "\x1b[2J\x1b[31mQ",
    "</script><b>",
    "]]><!--",
    "a|b`c`d",
    "two\nlines",
    "::error file=x::owned",
    "##vso[task.complete]",
    "\u202eevil\u2066",
    "@everyone #1 http://example.invalid",
    "{0}[text](link)",
    "\x00\x7f\x9b31m",
    "\ud800",
    "x" * 300,
    "電" * 60,
)
"""Texts a netlist may hold that must not act in any face."""

DRIVE_ASSUMED = "the drive DRV is taken as stiff, from 0 V to 12 V"

ENTRY = PartEntry(
    "QSN1", "npn", ratings={"vceo": Figure(40.0, "memory"), "ic": Figure(0.2, "a data sheet")}, source="a data sheet"
)

KINDS = {"pass": "npn", "shunt": "npn", "sense": "resistor", "base_stop": "resistor", "drive": "resistor"}
VALUES = {"sense": 1.0, "base_stop": 220.0, "drive": 1000.0}


def sample_review(names: Mapping[str, str] = PLAIN, *, notes: int = 0) -> Review:
    """Return the sample; ``notes`` adds that many findings to it."""
    board = _board(names)
    first = _limiter(names, names["pass"], "emitter-sensed")
    second = _limiter(names, "CH2/Q20", "foldback")
    third = _limiter(names, "Q30", "emitter-sensed")
    limiters = (
        ReviewedLimiter(
            limiter=first,
            needs=LimiterLimits(carry_A=0.7, cap_A=1.2, output_V=12.0),
            circuit=_circuit(names),
            solution=_solution(0.367, names),
            verdict="fails",
            not_checked=(
                NotChecked("trips-on-peaks", f"[limiter.{first.id}] peak"),
                NotChecked("foldback-locks-out", f"[limiter.{first.id}] load"),
                *(
                    NotChecked("resistor-power", f"a POWER property of {names[role]}, or ratings")
                    for role in ("sense", "drive")
                ),
            ),
            assumed=(DRIVE_ASSUMED, f"{names['shunt']}: BF taken as 100"),
            bench=_bench(names),
            if_a_part_fails=IfPartFails(
                (
                    PartFails((names["sense"],), "sense", "open", 0.0, 0.0),
                    PartFails((names["sense"],), "sense", "short", 1.4, 3.8),
                    PartFails((names["base_stop"],), "base_stop", "open", None, None),
                ),
                ("F1",),
            ),
            start_up=StartUp(True, 3.2e-3, 0.021, 4.4),
            formula=Comparison(
                "plain",
                "V_BE / R_S",
                {"V_BE": 0.6, "R_S": 1.0},
                0.6,
                0.367,
                -0.388,
                (Failing("the shunt's V_BE is 0.6 V", 0.4, 0.9),),
                0.367,
            ),
        ),
        ReviewedLimiter(
            second,
            LimiterLimits(),
            None,
            Solution(not_solved="node N3 floats"),
            "not judged",
            not_checked=(NotChecked("currents", "node N3 floats"),),
        ),
        ReviewedLimiter(
            third,
            LimiterLimits(carry_A=0.2),
            _circuit(names),
            _solution(0.9, names),
            "passes",
            assumed=(DRIVE_ASSUMED,),
            bench=_bench(names),
        ),
    )
    findings = (
        _carry_not_met(names, first.id),
        replace(_base_stop(names, first.id), waived="the driver gives 5 mA at most", waived_by="A. Reviewer"),
        Finding(
            check="collector-emitter-swapped",
            limiter=None,
            parts=("Q40",),
            nets=(names["out"],),
            message=f"Q40 stands the wrong way round: collector on {names['out']}",
            remedy="exchange collector and emitter of Q40",
            level="error",
            file=names["name"],
            line=9,
            column=1,
        ),
        *(
            Finding(
                check="base-stop-absent",
                limiter=third.id,
                parts=(names["shunt"], f"R{number}"),
                message=f"nothing stands between R{number} and the base of {names['shunt']}",
                remedy="fit 100 ohm",
                level="note",
                assumption=number % 7 == 0,
                file=names["name"],
                line=100 + number,
                column=3,
            )
            for number in range(notes)
        ),
    )
    named = {item.limiter.id: identifying_parts(item.limiter.roles) for item in limiters}
    return Review(
        board=board,
        limits=Limits(file="lamp.toml", assumed=("vbe_spread = 40 mV",)),
        found=Found((first, second, third), remarks=("Q11 also fits two-transistor-sink",)),
        limiters=limiters,
        findings=stamp_fingerprints(findings, named),
        assumed=("resistors that state no tolerance have 1 %",),
        remarks=("lamp-waivers.toml:7: this waiver matches nothing",),
        not_checked=(NotChecked("limiter-absent", "the power rating of R77"),),
    )


def _carry_not_met(names: Mapping[str, str], limiter: str) -> Finding:
    return Finding(
        check="carry-not-met",
        limiter=limiter,
        parts=(names["sense"], names["shunt"]),
        nets=(names["out"],),
        message=f"{names['pass']} carries 282 mA at 85 degC, the board needs 700 mA",
        working=(
            WorkingLine("V_BE at 85 degC", "N_F V_T ln(I_C / I_S)", 0.482, "V", "Gummel and Poon 1970"),
            WorkingLine("carries", f"0.482 V / ({names['sense']} = 1 ohm)", 0.28213579, "A"),
        ),
        remedy=f"fit 0.36 ohm in place of {names['sense']}",
        level="error",
        file=names["name"],
        line=12,
        column=5,
    )


def _base_stop(names: Mapping[str, str], limiter: str) -> Finding:
    return Finding(
        check="base-stop-absent",
        limiter=limiter,
        parts=(names["shunt"],),
        nets=(names["out"],),
        message=f"nothing limits the current into the base of {names['shunt']}",
        working=(WorkingLine("I_B", "(1.4 A x 1 ohm - 0.8 V) / 1 ohm", 0.6, "A"),),
        remedy="fit 100 ohm between the sense resistor and the base",
        level="warning",
        file=names["name"],
        line=14,
        column=5,
    )


def _board(names: Mapping[str, str]) -> Board:
    parts = tuple(
        Part(
            id=names[role],
            designator=names[role],
            cell="CELL",
            library="LIB",
            properties={"value": Property("Value", "1R", "instance", 20 + place, 9)},
            pins=(Pin("1", "1", 0), Pin("2", "2", 1)),
            line=20 + place,
            column=3,
        )
        for place, role in enumerate(KINDS)
    )
    texts = ("DRV", "+12V", "N1", names["out"], "GND")
    netlist = Netlist(
        file=names["name"],
        sha256="0" * 64,
        design="LAMP",
        parts=parts,
        nets=tuple(Net(text, (), 5, 1) for text in texts),
        warnings=(Warning("bytes outside ASCII, read as utf-8", 3, 7, 2),),
        facts={"views": "one flat netlist", "designators": "from designator forms"},
    )
    board_parts = tuple(
        BoardPart(
            index=place,
            part=part,
            kind=KINDS[role],
            kind_from="property",
            roles={"base": 2, "emitter": 3} if KINDS[role] == "npn" else {"1": 2, "2": 3},
            roles_from="port names",
            part_number="QSN1" if KINDS[role] == "npn" else None,
            values=Values(text="1R", value=VALUES.get(role)),
            entry=ENTRY if role == "shunt" else None,
        )
        for place, (role, part) in enumerate(zip(KINDS, parts, strict=True))
    )
    voltages = {"+12V": 12.0, "GND": 0.0}
    nets = tuple(
        BoardNet(
            index,
            (text,),
            (),
            Supply(Range(voltages[text], voltages[text], voltages[text]), "net name") if text in voltages else None,
        )
        for index, text in enumerate(texts)
    )
    elements = tuple(
        Element(part.index, part.kind, {"1": 2, "2": 3}, (part.index,), part.values.value, part.index)
        for part in board_parts
    )
    return Board(netlist, board_parts, nets, elements, ((), (), (), (), ()), ("GND is taken as 0 V from its name",))


def _limiter(names: Mapping[str, str], identity: str, topology: str) -> Limiter:
    first = identity == names["pass"]
    found = {role: (names[role],) for role in KINDS} if first else {"pass": (identity,), "sense": (f"R of {identity}",)}
    return Limiter(
        id=identity,
        topology=topology,
        polarity="n",
        elements={role: (place,) for place, role in enumerate(KINDS)} if first else {},
        roles={role: found.get(role, ()) for role in ROLES},
        nets={"drive": 0, "feed": 1, "sense": 2, "far": 3, "output": 3} if first else dict.fromkeys(("drive", "output")),
        also_matched=("two-transistor-sink",) if first else (),
    )


def _bench(names: Mapping[str, str]) -> Bench:
    return Bench(
        circuit=_circuit(names),
        element_of={names["pass"]: 0, names["sense"]: 1},
        nets={"+12V": "held at 12 V, by its name", names["out"]: "the output", "N1": "solved for"},
        assumed=(("drive", DRIVE_ASSUMED), ("model", f"{names['shunt']}: BF taken as 100")),
    )


def _circuit(names: Mapping[str, str]) -> Circuit:
    twelve = Range(11.4, 12.0, 12.6)
    return Circuit(
        devices=(
            Device(names["pass"], "npn", ("+12V", "DRV", "N1"), {"IS": 1e-14}, assumed=("BF taken as 100",)),
            Device(names["sense"], "resistor", ("N1", names["out"]), {"R": 1.0}, tolerance=0.01),
        ),
        held={"+12V": twelve, "GND": Range(0.0, 0.0, 0.0)},
        drive=Drive("DRV", Range(0.0, 0.0, 0.0), twelve, resistance_ohm=1000.0, assumed=True),
        output=names["out"],
        shorts=("GND",),
        shunt=(names["shunt"],),
        pass_devices=(names["pass"],),
        sense=(names["sense"],),
        output_reach_V=(0.0, 12.0),
    )


def _solution(holds: float, names: Mapping[str, str]) -> Solution:
    def at(ambient: float, factor: float) -> Currents:
        usual = holds * factor
        pair = (usual * 0.95, usual * 1.05)
        return Currents(
            ambient_degC=ambient,
            begins_A=usual * 0.84,
            holds_A=usual,
            carries_A=usual,
            most_A=usual,
            unlimited_A=1.4,
            shunt_A=0.0105,
            pass_A=usual,
            limited_by_short="limiter",
            limited_by_output="limiter",
            begins_range_A=(pair[0] * 0.84, pair[1] * 0.84),
            holds_range_A=pair,
            carries_range_A=pair,
            most_range_A=pair,
        )

    states = {
        names["pass"]: State(holds, 11.2, 11.2 * holds, 0.0037, 0.8),
        names["sense"]: State(holds, holds, holds**2),
    }
    short = Point(0.0, holds, states)
    return Solution(
        currents=(at(-10.0, 1.15), at(27.0, 1.0), at(85.0, 0.8)),
        locus=(short, Point(6.0, holds, {})),
        held_short=short,
        worst_point=short,
        advice=Advice(
            0.22,
            0.19,
            False,
            (Effect(names["base_stop"], True, 0.3, 0.25),),
            names["base_stop"],
            (Fit("collector to base of the shunt", ("DRV", "N1"), 1e-9, None, 0.7, 0.62),),
        ),
        sensitivities=(Sensitivity(names["sense"], "R", -0.9),),
        loop=Loop(
            0.223456789,
            1.2e6,
            0.19,
            41.0,
            8.1e5,
            38.0,
            own_damping=0.223456789,
            worst=Worst(0.0345678, 1.1e6, 85.0, 5e-7, {"R11.R": -1.0}),
            worst_without_wiring=Worst(0.19, 1.15e6, 85.0, 0.0, {"R11.R": -1.0}),
            natural=((2.1e4, 1.0), (1.2e6, 0.223456789)),
            table=tuple((10.0**decade, 41.0 / decade, -30.0 * decade) for decade in range(1, 8)),
        ),
        step=Step(True, 1.2e-6, 1.31, 2.5e-6),
    )
