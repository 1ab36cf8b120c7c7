"""The survey as lines of 80 columns."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from protlint.report.digest import MOST_NAMES, assumptions, listed, place_of, times
from protlint.report.figures import counted
from protlint.report.layout import painted, table, wrapped
from protlint.report.safe import readable, throughout
from protlint.report.shape import Document
from protlint.report.survey_limiter import limiter_lines, range_words

MOST_PARTS = 4
"""Parts named of one cell whose kind or pins are not known."""


def rendered_survey(facts: Document, *, colour: bool = False) -> str:
    """Return a survey as text; ``colour`` adds the colours of a terminal."""
    safe: Document = throughout(facts, readable)
    netlist = safe["netlist"]
    limiters = counted(len(safe["limiters"]), "limiter") if safe["limiters"] else "no limiter"
    wrong = f", {counted(len(safe['faults']), 'fault')} in the wiring" if safe["faults"] else ""
    title = (
        f"{netlist['file']}: {limiters} found{wrong}; design {netlist['design']}, {counted(netlist['parts'], 'part')}, "
        f"{counted(netlist['nets'], 'net')}, {counted(netlist['pins'], 'connected pin')}"
    )
    lines = [painted(line, "heading", colour=colour) for line in wrapped(title, indent=2, first="")]
    sections = (
        ("Limiters", limiter_lines(safe["limiters"], colour)),
        ("Drawn wrong", _faults(safe["faults"])),
        ("What is missing", _missing(safe)),
        ("Assumed", _items(_assumed(safe))),
        ("How it was read", _reading(safe)),
        ("Parts", _parts(safe)),
        ("Supplies", _supplies(safe["supplies"])),
        ("Remarks", _items(safe["remarks"])),
    )
    for heading, body in sections:
        if body:
            lines += ["", painted(heading, "heading", colour=colour), *body]
    return "\n".join([*lines, "", *wrapped(safe["caution"])]) + "\n"


def _assumed(facts: Document) -> list[str]:
    """Return what was assumed, of each device of a circuit as well, every sentence once."""
    limiters = [
        {
            **limiter,
            "assumed": [
                *limiter["assumed"],
                *(f"{device['name']}: {text}" for device in limiter["devices"] for text in device["assumed"]),
            ],
        }
        for limiter in facts["limiters"]
    ]
    return assumptions({**facts, "limiters": limiters})


def _items(texts: Iterable[str]) -> list[str]:
    return [line for text in texts for line in wrapped(text, indent=4, first="  - ")]


def _reading(facts: Document) -> list[str]:
    lines = [line for name, sentence in facts["reading"] for line in wrapped(f"{name}: {sentence}", indent=4, first="  ")]
    for warning in facts["warnings"]:
        place = place_of({**warning, "file": facts["netlist"]["file"]})
        lines += wrapped(f"{place}: {warning['message']}{times(warning['count'])}", indent=4, first="  - ")
    return lines


def _parts(facts: Document) -> list[str]:
    """Show how many parts of each kind there are, and how their kinds, pins and values were known."""
    pins = {row["kind"]: _sources(row) for row in facts["pins"]}
    lines = []
    for row in facts["kinds"]:
        roles = f"; pins by {pins[row['kind']]}" if row["kind"] in pins else ""
        lines += wrapped(f"kind by {_sources(row)}{roles}", indent=26, first=f"  {row['count']:>6}  {row['kind']:<16}")
    values = facts["values"]
    if values["read"]:
        text = f"{counted(values['read'], 'value')} read"
        stated = [f"{values[f'with_{key}']} with their {key}" for key in ("tolerance", "power") if values[f"with_{key}"]]
        lines += wrapped(", ".join([text, *stated]), indent=4, first="  ")
    if values["not_fitted"]:
        lines += wrapped(f"not fitted: {listed(values['not_fitted'])}", indent=4, first="  ")
    return lines


def _sources(row: Document) -> str:
    known = row["known_from"]
    if len(known) == 1:
        return str(known[0][0])
    return ", ".join(f"{source} ({count})" for source, count in known)


def _supplies(supplies: Sequence[Document]) -> list[str]:
    alike: dict[tuple[str, str, str], list[str]] = {}
    for supply in supplies:  # one inside each of many like blocks is told once
        inside, _, name = supply["net"].rpartition("/")
        key = (name if inside else f"/{name}", range_words(supply), supply["known_from"])
        alike.setdefault(key, []).append(supply["net"])
    told = list(alike.items())
    rows = [
        [f"{nets[0]} and {len(nets) - 1} alike" if nets[1:] else nets[0], held, f"by {known_from}"]
        for (_, held, known_from), nets in told[:MOST_NAMES]
    ]
    if any(len(row[0]) > 30 for row in rows):
        lines = [line for row in rows for line in wrapped(": ".join(row), indent=4, first="  ")]
    else:
        lines = table(rows, left=(0, 1, 2))
    if len(told) > MOST_NAMES:
        lines.append(f"  and {len(told) - MOST_NAMES} more")
    return lines


def _missing(facts: Document) -> list[str]:
    unknown, values = facts["unknown"], facts["values"]
    texts: list[str] = []
    texts += _of_each("kind of the cell {} not known", unknown["kind"])
    texts += _of_each("pin roles of {} not known ([pins] in the limits file)", unknown["pins"])
    if values["absent"]:
        texts.append(f"no value: {listed(values['absent'])}")
    texts += [
        f'value of {row["part"]} not read: "{row["text"]}" ({row["why"]})' for row in values["unreadable"][:MOST_NAMES]
    ]
    if len(values["unreadable"]) > MOST_NAMES:
        texts.append(f"and {len(values['unreadable']) - MOST_NAMES} more values not read")
    for row in unknown["part_data"][:MOST_NAMES]:
        texts.append(f"no part data for {row['part_number']} (--parts): {listed(row['parts'])}")
    if len(unknown["part_data"]) > MOST_NAMES:
        texts.append(f"no part data for {listed([row['part_number'] for row in unknown['part_data'][MOST_NAMES:]])}")
    return _items(texts)


def _of_each(says: str, rows: Sequence[Document]) -> list[str]:
    """Say something of every cell or type, with its parts; of many, only the names of the last ones."""
    texts = [f"{says.format(row['of'])}: {listed(row['parts'], MOST_PARTS)}" for row in rows[:MOST_NAMES]]
    if len(rows) > MOST_NAMES:
        texts.append(says.format(listed([row["of"] for row in rows[MOST_NAMES:]])))
    return texts


def _faults(faults: Sequence[Document]) -> list[str]:
    return _items(f"{fault['fault']} ({', '.join(fault['parts'])}): {fault['says']}" for fault in faults)
