"""What a limiter does, in sentences: what the table of currents has no room for."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.report.figures import ambient, figure, percent
from protlint.report.shape import Document

ROLE_WORDS = {
    "pass": "pass", "driver": "driver", "sense": "sense", "shunt": "shunt", "base_stop": "base stop", "preset": "preset",
    "steering": "steering", "compensation": "compensation", "drive": "drive", "others": "also",
}  # fmt: skip

AS_SOLVED = 0.05
"""Within this a formula's figure is as good as the solved one."""


def sentences(limiter: Document) -> Iterator[str]:
    """Yield what is known of a solved limiter beside its currents, one sentence each."""
    yield from _begins(limiter)
    for place, words in (("output", "at the working output"), ("short", "in the short")):
        at = [ambient(row["ambient_degC"]) for row in limiter["currents"] if row["limited_by"][place] == "drive"]
        if at:
            yield f"At {', '.join(at)} the drive gives out {words}, not the limiter."
    yield from _formula(limiter["formula"])
    yield from _regulates(limiter["regulates"])
    yield from _shorts(limiter)
    yield from _loop(limiter)
    yield from _start_up(limiter["start_up"])
    yield from _if_a_part_fails(limiter["if_a_part_fails"])


def _begins(limiter: Document) -> Iterator[str]:
    usual = limiter["currents"][len(limiter["currents"]) // 2]
    words = (("begins_A", "limiting begins at"), ("unlimited_A", "without the shunt"), ("shunt_A", "the shunt takes"))
    facts = [f"{said} {figure(usual[key], 'A')}" for key, said in words if usual[key] is not None]
    if facts:
        yield f"At {ambient(usual['ambient_degC'])}: {', '.join(facts)}."


def _formula(formula: Document | None) -> Iterator[str]:
    """Put the hand calculation beside the solved figure, and say which of its assumptions fails."""
    if formula is None or formula["figure_A"] is None or formula["difference"] is None:
        return
    if formula["figure_A"] <= 0.0:
        yield f"By hand {formula['formula']} gives no current at all: the formula does not hold here."
        return
    by_hand = f"By hand {formula['formula']} gives {figure(formula['figure_A'], 'A')}"
    if abs(formula["difference"]) <= AS_SOLVED:
        yield f"{by_hand}, as solved within 5 %."
        return
    more = f"{percent(abs(formula['difference']))} {'more' if formula['difference'] > 0.0 else 'less'}"
    fails = "; nor that ".join(one["assumption"] for one in formula["fails"])
    yield f"{by_hand}; solved, {more}" + (f": it does not hold that {fails}." if fails else ".")


def _regulates(regulates: Document | None) -> Iterator[str]:
    if regulates is not None:
        yield (
            f"Regulates {figure(regulates['current_A'], 'A')}: {figure(regulates['per_supply_volt'], '%')} a supply volt, "
            f"{figure(regulates['per_kelvin'], '%')} a kelvin, from {figure(regulates['compliance_V'], 'V')} up."
        )


def _shorts(limiter: Document) -> Iterator[str]:
    """Say what it holds into each short where there are several."""
    if len(limiter["shorts"]) > 1:
        usual = [f"{figure(one['holds_A'][len(one['holds_A']) // 2], 'A')} into {one['net']}" for one in limiter["shorts"]]
        yield f"Holds {', '.join(usual)}; the figures are for {limiter['short']}."


def _loop(limiter: Document) -> Iterator[str]:
    loop, step = limiter["loop"], limiter["step"]
    if loop["least_damping"] is not None:
        worst = f"; {figure(loop['worst_damping'])} at worst" if loop["worst_damping"] is not None else ""
        place = f"least damping {figure(loop['least_damping'])} at {figure(loop['at_Hz'], 'Hz')}"
        yield f"Loop: {place if loop['at_Hz'] is not None else 'nothing swings as drawn'}{worst}."
    if step["settles"] is not None:
        after = f"after {figure(step['delay_s'], 's')}" if step["delay_s"] else "at once"
        settles = f"settles {after}" if step["settles"] else "does not settle"
        yield f"Step into the short: {settles}, peak {figure(step['peak_A'], 'A')}."


def _start_up(start_up: Document | None) -> Iterator[str]:
    if start_up is None:
        return
    if not start_up["starts"]:
        yield "Start-up into the load: it does not come up."
        return
    yield (
        f"Start-up into the load: up after {figure(start_up['lasts_s'], 's')}; the pass device takes "
        f"{figure(start_up['pass_energy_J'], 'J')}, {figure(start_up['pass_peak_W'], 'W')} at most."
    )


def _if_a_part_fails(table: Document | None) -> Iterator[str]:
    """Say what the output passes into the short with a part failed."""
    if table is None or not table["rows"]:
        return
    cases = []
    for row in table["rows"]:
        times = f" ({figure(row['of_holds'])} times)" if row["of_holds"] is not None and row["of_holds"] > 1.1 else ""
        cases.append(
            f"{ROLE_WORDS[row['role']]} {'+'.join(row['parts'])} {row['how']} {figure(row['output_A'], 'A')}{times}"
        )
    fuses = f"; upstream stands {', '.join(table['fuses'])}" if table["fuses"] else "; no fuse upstream is named"
    yield f"If a part fails: {', '.join(cases)}{fuses}."
