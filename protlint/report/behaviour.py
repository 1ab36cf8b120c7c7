"""What a limiter does, in sentences: what the table of currents has no room for."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from protlint.quantities import format_ratio
from protlint.report.figures import ambient, current, figure, percent
from protlint.report.shape import Document

ROLE_WORDS = {
    "pass": "pass", "driver": "driver", "sense": "sense", "shunt": "shunt", "base_stop": "base stop", "preset": "preset",
    "steering": "steering", "compensation": "compensation", "drive": "drive", "others": "also",
}  # fmt: skip

AS_SOLVED = 0.05
"""Within this a formula's figure is as good as the solved one."""


HOW = {"short": "shorted"}

TRIPS = 1.5
"""What begins so many times above what it holds is a latch: it has tripped there."""

NOTHING = 1e-3
"""A current below this share of holds is next to nothing."""


def sentences(limiter: Document) -> Iterator[str]:
    """Yield what is known of a solved limiter beside its currents, one sentence each."""
    yield from _begins(limiter)
    yield from _drive(limiter["currents"])
    yield from _formula(limiter["formula"])
    yield from _regulates(limiter["regulates"])
    yield from _shorts(limiter)
    yield from _loop(limiter)
    yield from _start_up(limiter["start_up"])
    yield from _if_a_part_fails(limiter)


def _begins(limiter: Document) -> Iterator[str]:
    usual = limiter["currents"][len(limiter["currents"]) // 2]
    begins_A, holds_A = usual["begins_A"], usual["holds_A"]
    if begins_A is not None and holds_A is not None and begins_A > TRIPS * holds_A:
        begins = f"it trips at {{}} and then passes {current(holds_A, begins_A)} until the drive is taken away"
    else:
        begins = "limiting begins at {}"
    words = (("begins_A", begins), ("unlimited_A", "without the shunt {} would flow"),
             ("shunt_A", "the shunt takes {}"))  # fmt: skip
    facts = [said.format(current(usual[key], usual["holds_A"])) for key, said in words if usual[key] is not None]
    if facts:
        yield f"At {ambient(usual['ambient_degC'])} {'; '.join(facts)}."


def _drive(currents: Sequence[Document]) -> Iterator[str]:
    """Say where the drive gives out, told together where it does so in both places at the same ambients."""
    places: dict[str, list[str]] = {}
    for place, words in (("output", "at the working output"), ("short", "in the short")):
        at = [ambient(row["ambient_degC"]) for row in currents if row["limited_by"][place] == "drive"]
        if at:
            where = "at every ambient" if len(at) == len(currents) else f"at {' and '.join(at)}"
            places.setdefault(where, []).append(words)
    for where, there in places.items():
        yield f"The drive gives out {' and '.join(there)}, not the limiter, {where}."


def _formula(formula: Document | None) -> Iterator[str]:
    """Put the hand calculation beside the solved figure, and say which of its assumptions fails."""
    if formula is None or formula["figure_A"] is None or formula["difference"] is None:
        return
    difference = formula["difference"]
    gives = figure(formula["figure_A"], "A") if formula["figure_A"] > 0.0 else "no current at all"
    by_hand = f"By hand {formula['formula']} gives {gives}"
    if abs(difference) <= AS_SOLVED:
        yield f"{by_hand}, as solved within 5 %."
        return
    comparable = formula["figure_A"] > 0.0 and difference <= 1.0
    shift = f", {percent(abs(difference))} {'more' if difference > 0.0 else 'less'}" if comparable else ""
    fails = "; ".join(one["assumption"] for one in formula["fails"])
    yield f"{by_hand}, solved {figure(formula['solved_A'], 'A')}{shift}" + (f". Not so here: {fails}." if fails else ".")


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
    """Tell the damping of the limiter's own modes as drawn, over the spreads, and with wiring in the short."""
    loop, step = limiter["loop"], limiter["step"]
    own = loop["own_damping"] if loop["own_damping"] is not None else loop["least_damping"]
    if own is not None:
        at = f" at {figure(loop['at_Hz'], 'Hz')}" if loop["at_Hz"] is not None and own == loop["least_damping"] else ""
        drawn = f"damping {format_ratio(own)}{at} as drawn{' (nothing swings)' if own >= 1.0 else ''}"
        worst = ", ".join(_worst(loop))
        yield f"Loop: {drawn}{f'; at worst {worst}' if worst else ''}."
    if step["settles"] is not None:
        after = f"after {figure(step['delay_s'], 's')}" if step["delay_s"] else "at once"
        settles = f"settles {after}" if step["settles"] else "does not settle"
        energy = f", {figure(step['pass_energy_J'], 'J')} into the pass device" if step["pass_energy_J"] else ""
        yield f"Step into the short: {settles}, peak {figure(step['peak_A'], 'A')}{energy}."


def _worst(loop: Document) -> Iterator[str]:
    told = None
    for worst in (loop["worst_without_wiring"], loop["worst"]):
        if worst is not None and worst["ambient_degC"] is not None and worst != told:
            wiring = f"with {figure(worst['wiring_H'], 'H')} in the short" if worst["wiring_H"] else "within every spread"
            yield f"{format_ratio(worst['damping'])} {wiring}"
            told = worst


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


def _if_a_part_fails(limiter: Document) -> Iterator[str]:
    """Say what the output passes into the short with a part failed."""
    table, usual = limiter["if_a_part_fails"], limiter["currents"][len(limiter["currents"]) // 2]
    if table is None or not table["rows"]:
        return
    cases: dict[str, list[str]] = {}
    for row in table["rows"]:
        share = row["of_holds"] or 0.0
        times = f" ({float(f'{share:.2g}'):g} times holds)" if share > 1.1 else ""
        passes = "not known" if row["output_A"] is None else current(row["output_A"], usual["holds_A"], NOTHING)
        if row["output_A"] and row["of_holds"] is None and usual["holds_A"]:
            passes = f"more than the {passes} that the pass device bears, as much as supply and wiring give"
        name = f"{ROLE_WORDS[row['role']]} {'+'.join(row['parts'])}"
        cases.setdefault(name, []).append(f"{HOW.get(row['how'], row['how'])} {passes}{times}")
    told = "; ".join(f"{name} {', '.join(hows)}" for name, hows in cases.items())
    fuses = f"upstream stands {', '.join(table['fuses'])}" if table["fuses"] else "no fuse upstream is named"
    yield f"Into the short with a part failed: {told}; {fuses}."
