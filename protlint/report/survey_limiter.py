"""One limiter of a survey as lines of 80 columns: its parts, what holds its nets, and what was solved of it."""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence

from protlint.report.behaviour import ROLE_WORDS
from protlint.report.figures import ambient, figure
from protlint.report.layout import painted, shortened, table, wrapped
from protlint.report.shape import Document
from protlint.report.text import POLARITY_WORDS

STEPS = {"V_BE": (0.01, "+10 mV"), "V_F": (0.01, "+10 mV"), "V_TO": (0.1, "+0.1 V"), "B_F": (0.1, "+10 %")}
"""The change of a parameter for which its effect is told, where that is not one per cent: size, and in words."""

MOST_MOVES = 4

MOST_GAINS = 13


def range_words(ends: Document) -> str:
    """Return a voltage with its ends, in words: one figure where it has no range."""
    if ends["low"] == ends["high"]:
        return figure(ends["usual"], "V")
    return f"{figure(ends['low'], 'V')} .. {figure(ends['usual'], 'V')} .. {figure(ends['high'], 'V')}"


def limiter_lines(limiters: Sequence[Document], colour: bool) -> list[str]:
    """Return all limiters, channels that are alike in every figure told once."""
    if not limiters:
        return ["  none found"]
    lines: list[str] = []
    shown: dict[str, str] = {}
    for place, limiter in enumerate(limiters):
        lines += [""] if place else []
        figures = _figures(limiter)
        like = shown.setdefault(figures, limiter["id"]) if figures is not None else limiter["id"]
        lines += _limiter(limiter, colour, None if like == limiter["id"] else like)
    return lines


def _figures(limiter: Document) -> str | None:
    """Return what was held and solved for, apart from names, so that like channels are told once; None where nothing was."""
    if limiter["held_short"] is None:
        return None
    states = [[value for key, value in device.items() if key != "device"] for device in limiter["held_short"]["devices"]]
    moves = [[row["parameter"], row["relative"]] for row in limiter["sensitivities"]]
    held = [words for _, words in limiter["held"]]
    drive = {key: value for key, value in (limiter["drive_ends"] or {}).items() if key != "node"}
    kind = [limiter["topology"], limiter["polarity"], held, drive]
    return json.dumps([kind, states, moves, limiter["loop"], limiter["loop_table"]])


def _limiter(limiter: Document, colour: bool, like: str | None) -> list[str]:
    kind = f"{limiter['topology']}, {POLARITY_WORDS.get(limiter['polarity'], limiter['polarity'])}"
    lines = wrapped(f"{limiter['id']}: {kind}", indent=4, first="  ")
    lines = [painted(line, "heading", colour=colour) for line in lines]
    values = {part["id"]: _value(part) for part in limiter["parts"]}
    roles = [
        f"{ROLE_WORDS[role]} {', '.join(values.get(name, name) for name in names)}"
        for role, names in limiter["roles"].items()
        if names
    ]
    lines += wrapped("; ".join(roles), indent=6, first="    ")
    drive = limiter["drive_ends"]
    driven = drive["node"] if drive is not None else None
    held = _nets([pair for pair in limiter["held"] if pair[0] != driven])
    if like is not None:
        own = f"output {limiter['nets']['output']}" + (f", drive {driven}" if driven is not None else "")
        lines += wrapped(f"{own}; held, driven and solved as {like}", indent=6, first="    ")
    elif held:
        lines += wrapped("; ".join(f"{', '.join(nets)} {words}" for words, nets in held.items()), indent=6, first="    ")
    if drive is not None and like is None:
        lines += wrapped(_drive(drive), indent=6, first="    ")
    if limiter["shorts"] and like is None:
        lines += wrapped(f"a short ties the output to {', '.join(limiter['shorts'])}", indent=6, first="    ")
    lines += [line for need in limiter["missing"] for line in wrapped(f"missing: {need}", indent=6, first="    ")]
    if limiter["also_matched"]:
        lines += wrapped(f"also fits: {', '.join(limiter['also_matched'])}", indent=6, first="    ")
    if like is not None:
        return lines
    lines += _sensitivities(limiter["sensitivities"])
    lines += _states(limiter["held_short"])
    lines += _loop(limiter["loop"], limiter["loop_table"])
    return lines + [line for text in _advice(limiter["advice"]) for line in wrapped(text, indent=6, first="    ")]


def _nets(held: Sequence[Sequence[str]]) -> dict[str, list[str]]:
    """Gather the nets that are held alike."""
    alike: dict[str, list[str]] = {}
    for net, words in held:
        alike.setdefault(words, []).append(net)
    return alike


def _value(part: Document) -> str:
    """Name a part with its value or type."""
    if part["value"] is not None and part["unit"]:
        return f"{part['id']} {figure(part['value'], part['unit'])}"
    return f"{part['id']} {part['part_number']}" if part["part_number"] else str(part["id"])


def _drive(drive: Document) -> str:
    ends = f"drive {drive['node']}: {range_words(drive['low_V'])} to {range_words(drive['high_V'])}"
    limits = [
        f"through {figure(drive['resistance_ohm'], 'ohm')}" if drive["resistance_ohm"] else "stiff",
        f"{figure(drive['current_A'], 'A')} at most" if drive["current_A"] is not None else "",
        "assumed" if drive["assumed"] else "",
    ]
    return ", ".join([ends, *(text for text in limits if text)])


def _sensitivities(rows: Sequence[Document]) -> list[str]:
    """Say what moves holds most, for changes of a size that occurs."""
    moves = []
    for row in rows:
        if row["relative"] is not None:
            step, words = STEPS.get(row["parameter"], (0.01, "+1 %"))
            name = row["device"] if row["parameter"] in ("R", "V") else f"{row['device']} {row['parameter']}"
            moves.append((row["relative"] * step, f"{name} {words}"))
    moves.sort(key=lambda move: -abs(move[0]))
    texts = [f"{'+' if change > 0.0 else ''}{100.0 * change:.2g} % for {words}" for change, words in moves[:MOST_MOVES]]
    return wrapped(f"holds moves by {', '.join(texts)}", indent=6, first="    ") if texts else []


def _states(point: Document | None) -> list[str]:
    """Show current, voltage and dissipation of every device in the held short."""
    if point is None:
        return []
    rows = [["in the held short", "current", "voltage", "power"]]
    for device in point["devices"]:
        figures = [figure(device[key], unit) for key, unit in (("current_A", "A"), ("voltage_V", "V"), ("power_W", "W"))]
        rows.append([shortened(device["device"], 30), *figures])
    return table(rows, indent=4)


def _loop(loop: Document, gains: Sequence[Document]) -> list[str]:
    """Show the natural frequencies, where the worst damping lies, and the loop gain over frequency."""
    if loop["least_damping"] is None and loop["low_frequency_gain"] is None:
        return []
    rows = [
        ["loop in the held short", "", ""],
        ["  least damping", figure(loop["least_damping"]), f"at {figure(loop['at_Hz'], 'Hz')}"],
        ["  worst damping", figure(loop["worst_damping"]), _worst(loop["worst"])],
    ]
    for one in loop["natural"]:
        rows.append(["  natural frequency", figure(one["at_Hz"], "Hz"), f"damping {figure(one['damping'])}"])
    rows.append(["  low-frequency gain", figure(loop["low_frequency_gain"]), ""])
    crossover = figure(loop["crossover_Hz"], "Hz")
    rows.append(["  crossover", crossover, f"phase margin {figure(loop['phase_margin_deg'], 'deg')}"])
    every = max(1, -(-len(gains) // MOST_GAINS))
    rows += [
        ["  gain at " + figure(one["at_Hz"], "Hz"), figure(one["gain"]), f"phase {figure(one['phase_deg'], 'deg')}"]
        for one in gains[::every]
    ]
    return table(rows, indent=4, left=(0, 2))


def _advice(advice: Document | None) -> Iterator[str]:
    """Say what each part does to the damping of the limiter's own modes, and what would mend it."""
    if advice is None:
        return
    for one in advice["effects"]:
        yield f"without {one['part']}: damping {figure(one['own_damping'])}, {figure(one['worst_damping'])} at worst"
    for fit in advice["fits"]:
        ways = [f"{figure(fit['farad'], 'F')} {fit['place']}"] if fit["farad"] is not None else []
        ways += [f"{fit['instead_of']} taken out"] if fit["instead_of"] else []
        then = f"damping {figure(fit['own_damping'])}, {figure(fit['worst_damping'])} at worst"
        yield f"with {' and '.join(ways)}: {then}"
    if not advice["fits"] and not advice["enough"]:
        yield "no capacitor in the usual places brings enough damping"


def _worst(worst: Document | None) -> str:
    if worst is None or worst["at_Hz"] is None:
        return ""
    ambient_degC = f", {ambient(worst['ambient_degC'])}" if worst["ambient_degC"] is not None else ""
    wiring = f", {figure(worst['wiring_H'], 'H')} in the short" if worst["wiring_H"] else ""
    return f"at {figure(worst['at_Hz'], 'Hz')}{ambient_degC}{wiring}"
