"""What the remedies say, applied: for every check a spoiled board, and how its remedy and the next weaker one are fitted."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass

from protlint.quantities import preferred
from tests.support.judged import Job, folding, follower, gated, sink, source
from tests.support.scenarios import DIODE

SCALE = {"": 1.0, "k": 1e3, "m": 1e-3, "M": 1e6, "u": 1e-6, "µ": 1e-6}


@dataclass(frozen=True)
class Cure:
    """A board with a finding of ``check``; ``fit`` applies its remedy's text, ``weaker`` what should not do, or None."""

    check: str
    what: str
    job: Job
    fit: Callable[[Job, str], Job]
    weaker: Callable[[Job, str], Job] | None = None

    def __str__(self) -> str:
        return f"{self.check}: {self.what}"


def figure(text: str, unit: str) -> float:
    """Return the first quantity of a unit in a remedy."""
    found = re.search(rf"([0-9.]+) ([kmMuµ]?){re.escape(unit)}(?![A-Za-z/])", text)
    assert found, text
    return float(found[1]) * SCALE[found[2]]


def resistor(job: Job, name: str, ohm: float) -> Job:
    """Return the job with another resistance."""
    row = re.search(rf"^{name} RES (\S+)", job.board, re.MULTILINE)
    assert row
    return job.drawn((row[0], f"{name} RES {ohm:g}"))


def powered(job: Job, name: str, watts: float) -> Job:
    """Return the job with another power rating of a resistor."""
    row = re.search(rf"^({name} RES .*)POWER:\S+", job.board, re.MULTILINE)
    assert row
    return job.drawn((row[0], f"{row[1]}POWER:{watts:g}W"))


def down(value: float, series: str = "E24") -> float:
    return preferred(value * 0.999, series, "down")


def up(value: float, series: str = "E24") -> float:
    return preferred(value * 1.001, series, "up")


def ohms(name: str, weaker: Callable[[float], float] | None) -> dict[str, Callable[[Job, str], Job]]:
    """Return how a resistance is fitted, and the next weaker one."""
    ways: dict[str, Callable[[Job, str], Job]] = {"fit": lambda job, text: resistor(job, name, figure(text, "ohm"))}
    if weaker is not None:
        ways["weaker"] = lambda job, text: resistor(job, name, weaker(figure(text, "ohm")))
    return ways


def rating(part: str, name: str, unit: str, weaker: Callable[[float], float] = down) -> dict[str, Callable[[Job, str], Job]]:
    """Return how a part of another rating is fitted, and one of the next weaker rating."""

    def of(job: Job, value: float) -> Job:
        return job.rated(part, **{name: f"{value:g} {unit}"})

    return {
        "fit": lambda job, text: of(job, figure(text, unit)),
        "weaker": lambda job, text: of(job, weaker(figure(text, unit))),
    }


def with_rating(job: Job, text: str, name: str = "R2") -> Job:
    """Fit a sense resistance with the rating that the remedy gives it."""
    fitted = resistor(job, name, figure(text, "ohm"))
    return powered(fitted, name, figure(text, "W")) if "rated" in text else fitted


def cures() -> Iterator[Cure]:
    low = sink().drawn(("SNS GND POWER:1W", "SNS GND POWER:0.3W"))
    yield Cure(
        "carry-not-met",
        "carry alone",
        low.stated(carry="0.4 A", cap=None),
        with_rating,
        lambda job, text: resistor(job, "R2", up(figure(text, "ohm"))),
    )
    yield Cure("carry-not-met", "carry and cap", sink().stated(carry="0.35 A", cap="0.6 A"), with_rating)
    yield Cure("cap-exceeded", "cap alone", sink().stated(cap="0.3 A", carry=None), **ohms("R2", down))
    yield Cure("cap-exceeded", "a window for E96", sink().stated(carry="0.2 A", cap="0.283 A"), **ohms("R2", None))
    weak = sink().drawn(("R1 RES 390", "R1 RES 2k2"))
    yield Cure("drive-insufficient", "drive resistor", weak, **ohms("R1", up))
    bare = sink().drawn(
        ("R3 RES 100 SNS STOP POWER:0.125W", ""), ("BASE STOP GND", "BASE SNS GND"), ("10n BASE STOP", "10n BASE SNS")
    )

    def stopped(job: Job, text: str) -> Job:
        stop = f"C1 CAP\nR3 RES {figure(text, 'ohm'):g} SNS STOP POWER:0.125W\nC1 CAP"
        return job.drawn(
            ("BASE SNS GND", "BASE STOP GND"), ("10n BASE SNS", "10n BASE STOP"), ("C1 CAP", stop.split("\n", 1)[1])
        )

    yield Cure("base-stop-absent", "base stop", bare, stopped)
    yield Cure("base-stop-low", "base stop", sink().rated("QSN1", ib="12 mA"), **ohms("R3", down))
    yield Cure("base-stop-high", "base stop", gated().drawn(("1k5", "3k9")), **ohms("R42", up))

    def watts(name: str) -> dict[str, Callable[[Job, str], Job]]:
        sold = (0.0625, 0.1, 0.125, 0.25, 0.5, 0.75, 1.0, 2.0, 3.0, 5.0)
        return {
            "fit": lambda job, text: powered(job, name, figure(text, "W")),
            "weaker": lambda job, text: powered(job, name, sold[sold.index(figure(text, "W")) - 1]),
        }

    yield Cure("sense-resistor-power", "rating", sink().drawn(("SNS GND POWER:1W", "SNS GND POWER:0.125W")), **watts("R2"))
    yield Cure(
        "resistor-power", "rating", sink().drawn(("390 CMD BASE POWER:0.25W", "150 CMD BASE POWER:0.05W")), **watts("R1")
    )

    def volts(job: Job, value: float) -> Job:
        row = re.search(r"VOLTAGE:\S+", job.board)
        assert row
        return job.drawn((row[0], f"VOLTAGE:{value:g}V"))

    yield Cure(
        "resistor-power", "element voltage", source().drawn(("VOLTAGE:200V", "VOLTAGE:12V")),
        lambda job, text: volts(job, figure(text, "V")), lambda job, text: volts(job, down(figure(text, "V"))),
    )  # fmt: skip
    yield Cure(
        "drive-unlimited",
        "drive resistor",
        sink().drawn(("R1 RES 390", "R1 RES 100")).rated("QSN1", ic="40 mA").drawn(("BASE POWER:0.25W", "BASE POWER:1W")),
        **ohms("R1", down),
    )
    yield Cure(
        "driver-overloaded", "drive resistor", follower().limited("driver", "OPX1", power="30 mW"), **ohms("R10", down)
    )
    limited = sink().limited("drive", "CMD", current="30 mA")
    yield Cure("shunt-overloaded", "current rating", limited.rated("QSN1", ic="6 mA"), **rating("QSN1", "ic", "A"))
    yield Cure(
        "shunt-overloaded",
        "heat",
        limited.rated("QSN1", power=None, rth_ja="20000 K/W"),
        **rating("QSN1", "rth_ja", "K/W", up),
    )
    yield Cure("shunt-overloaded", "V_CEO", gated().rated("QSN1", vceo="8 V"), **rating("QSN1", "vceo", "V"))

    def diode(job: Job, text: str) -> Job:
        assert figure(text, "V") < 100.0
        told = re.search(r"anode to its \w+ \((\S+)\), cathode to its \w+ \((\S+)\)", text)
        assert told
        return job.drawn(("C1 CAP", f"D2 DIODE QSD1 {told[1]} {told[2]}\nC1 CAP")).knowing("QSD1", **DIODE)

    pulled = sink().drawn(("BASE STOP GND", "TAKE STOP GND"), ("C1 CAP", "D1 DIODE QSD1 BASE TAKE\nC1 CAP"))
    yield Cure(
        "reverse-base-emitter",
        "a diode across it",
        pulled.knowing("QSD1", **DIODE).limited("drive", "CMD", low="-8 V"),
        diode,
    )

    def steered(job: Job, text: str) -> Job:
        assert "in series with the collector of Q2: anode to BASE, cathode to the collector" in text
        assert figure(text, "V") < 100.0
        return job.drawn(("BASE STOP GND", "TAKE STOP GND"), ("C1 CAP", "D1 DIODE QSD1 BASE TAKE\nC1 CAP")).knowing(
            "QSD1", **DIODE
        )

    yield Cure(
        "reverse-base-emitter", "a diode in the collector",
        sink().limited("drive", "CMD", low="-4.7 V").rated("QSN1", ic="9.6 mA"), steered,
    )  # fmt: skip

    def cooled(job: Job, value: float) -> Job:
        return job.stated(sink=f"{value:g} K/W")

    yield Cure(
        "pass-overheated", "sink", sink().stated(sink="40 K/W"), lambda job, text: cooled(job, figure(text, "K/W")),
        lambda job, text: cooled(job, up(figure(text, "K/W"))),
    )  # fmt: skip
    hopeless = sink().stated(sink="8 K/W").rated("QPN1", rth_jc="30 K/W", power_case=None)

    def briefer(job: Job, text: str) -> Job:
        return job.stated(short=f"{figure(text, 's'):g} s", carry=None)

    yield Cure("pass-overheated", "no sink will do: a shorter short", hopeless, briefer)
    area = [{"lasts": "dc", "points": [["1 V", "8 A"], ["5 V", "1 A"], ["40 V", "0.05 A"]]}]

    def larger(job: Job, text: str) -> Job:
        return job.knowing(
            "QPN1",
            safe_area=[
                {"lasts": "dc", "points": [["1 V", "8 A"], ["7 V", "8 A"], ["40 V", f"{figure(text, 'A') * 2.0:g} A"]]}
            ],
        )

    yield Cure("pass-outside-safe-area", "curve", sink().knowing("QPN1", safe_area=area), larger)
    warm = [{"lasts": "dc", "points": [["1 V", "8 A"], ["5 V", "1.2 A"], ["40 V", "0.2 A"]]}]
    yield Cure(
        "pass-outside-safe-area", "sink", sink().stated(sink="16 K/W").knowing("QPN1", safe_area=warm),
        lambda job, text: cooled(job, figure(text, "K/W")), lambda job, text: cooled(job, up(figure(text, "K/W"))),
    )  # fmt: skip
    yield Cure("pass-outside-safe-area", "V_CEO", sink().rated("QPN1", vceo="10 V"), **rating("QPN1", "vceo", "V"))
    yield Cure("pass-outside-safe-area", "current rating", sink().rated("QPN1", ic="0.2 A"), **rating("QPN1", "ic", "A"))
    yield Cure(
        "foldback-locks-out",
        "preset's leg",
        folding().stated(load=None, load_current="0.75 A").drawn(("R61 RES 1 ", "R61 RES 1.1 ")),
        **ohms("R61", up),
    )
    yield Cure(
        "value-unreadable", "value", sink().drawn(("R2 RES 2.2", "R2 RES two")), lambda job, text: resistor(job, "R2", 2.2)
    )

    def agreed(job: Job, text: str) -> Job:
        said = re.search(r"R2 (\S+) in both", text)
        assert said
        return Job(job.board, job.tables, listed=f"Designator,Value\nR2,{said[1]}\n")

    high = source().stated(carry="0.35 A", cap=None, sink="1 K/W")
    yield Cure(
        "carry-not-met", "P type", high, lambda job, text: with_rating(job, text, "R21"),
        lambda job, text: resistor(job, "R21", up(figure(text, "ohm"))),
    )  # fmt: skip
    yield Cure("cap-exceeded", "P type", source().stated(cap="0.28 A", carry=None), **ohms("R21", down))
    yield Cure(
        "sense-resistor-power", "P type", source().drawn(("+15V SNS POWER:1W", "+15V SNS POWER:0.125W")), **watts("R21")
    )
    yield Cure("base-stop-low", "P type", source().rated("QSP1", ib="18 mA"), **ohms("R22", down))
    yield Cure(
        "pass-overheated", "P type", source().stated(sink="40 K/W"), lambda job, text: cooled(job, figure(text, "K/W")),
        lambda job, text: cooled(job, up(figure(text, "K/W"))),
    )  # fmt: skip
    listed = Job(sink().board, sink().tables, listed="Designator,Value\nR2,2R7\n")
    yield Cure("part-data-contradicts", "parts list", listed, agreed)
