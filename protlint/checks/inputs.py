"""What keeps a limiter from being judged, or casts doubt on it: values, pins and part data, of the parts that it needs."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.board.pins import BY_NAMES, FAMILY, numbers_at_odds
from protlint.checks.case import Answer, Case
from protlint.findings import WorkingLine
from protlint.toml.text import toml_key

CHIP_ROLES = ("pass", "driver", "shunt", "steering")
"""The roles of semiconductors."""


def value_unreadable(case: Case) -> Iterator[Answer]:
    """Yield a finding for each part on the bench whose value cannot be read, quoting its text.

    A warning where it is a capacitor's or an inductor's: the currents are known without, loop and delay are not.
    """
    for part_id in (*case.bench.parts_without_value, *case.bench.unread):
        part = case.part(part_id)
        unread = part_id in case.bench.unread
        text = part.values.text
        said = f'has the value "{text}", which cannot be read' if text else "states no value"
        why = f" ({part.values.unreadable})" if part.values.unreadable else ""
        yield case.finding(
            "value-unreadable",
            f"{part_id} {said}{why}{': how the loop behaves is not known without it' if unread else ''}",
            parts=(part_id,),
            working=(
                WorkingLine(
                    f"value of {part_id}", f'"{text}" is no IEC 60062 code and no number with an SI prefix', None, ""
                ),
            )
            if text
            else (),
            remedy=f"write the value of {part_id} as a number with its unit (4k7, 0.22R, 100n)",
            level="warning" if unread else None,
            subject=part_id,
        )


def part_data_missing(case: Case) -> Iterator[Answer]:
    """Yield a finding for each transistor or diode of the limiter that the part data does not know."""
    for part_id in case.parts(*CHIP_ROLES):
        part = case.part(part_id)
        if part.kind == "resistor" or part.entry is not None:
            continue
        number = f"part number {part.part_number}" if part.part_number else "no part number"
        own = f"{part_id}: "
        taken = [said.removeprefix(own) for about, said in case.bench.assumed if about == "model" and said.startswith(own)]
        instead = "figures usual for its kind were taken, with a wide spread" if taken else "no figure of it is known"
        yield case.finding(
            "part-data-missing",
            f"{part_id} ({number}) is in no part data: {instead}",
            parts=(part_id,),
            working=tuple(WorkingLine(f"taken for {part_id}", said, None, "") for said in taken),
            remedy="add its ratings to a part-data file and give it with --parts"
            if part.part_number
            else f"give {part_id} a part number",
            subject=part_id,
        )


def pins_unknown(case: Case) -> Iterator[Answer]:
    """Yield a finding for each part on the bench whose pins nobody can tell apart."""
    for missing in case.bench.missing:
        if missing.subject != "part" or missing.part is None:
            continue
        part = case.part(missing.part)
        pins = ", ".join(pin.number or pin.name for pin in part.part.pins)
        yield case.finding(
            "pins-unknown",
            f"the roles of the pins of {part.id} are not known (its pins: {pins})",
            parts=(part.id,),
            working=tuple(
                WorkingLine(
                    f"pin {pin.number or pin.name}", f"on {case.board.nets[pin.net].name}, its role not known", None, ""
                )
                for pin in part.part.pins
            ),
            remedy=f"state them in [pins.{part.part_number or part.part.cell}] of the limits file or in its part data",
            subject=part.id,
        )


def pin_on_two_nets(case: Case) -> Iterator[Answer]:
    """Yield a finding for each pin of the limiter's parts that the netlist joins to two nets."""
    netlist = case.board.netlist
    own = set(_needed(case))
    for doubt in netlist.pins_on_two_nets:
        part = netlist.parts[doubt.part]
        if part.id not in own:
            continue
        first, second = (netlist.nets[net].name for net in doubt.nets)
        yield case.finding(
            "pin-on-two-nets",
            f"pin {doubt.pin} of {part.id} is joined to {first} and to {second}; they were taken for one net",
            parts=(part.id,),
            nets=(first, second),
            working=(WorkingLine(f"{part.id}.{doubt.pin}", f"listed under {first} and under {second}", None, ""),),
            remedy=f"join pin {doubt.pin} of {part.id} to one net only, or name the two alike",
            subject=f"{part.id} {doubt.pin}",
        )


def designator_doubtful(case: Case) -> Iterator[Answer]:
    """Yield a finding for each designator that parts of the limiter share with others, and for each of its parts that has
    none yet."""
    netlist, own = case.board.netlist, _needed(case)
    for shared in netlist.duplicate_designators:
        parts = tuple(netlist.parts[index].id for index in shared.parts)
        if set(own).isdisjoint(parts):
            continue
        kinds = [f"{part.id}, a {part.cell}" for part in (netlist.parts[index] for index in shared.parts)]
        yield case.finding(
            "designator-doubtful",
            f"{shared.designator} is the designator of {len(parts)} different parts: a parts list, an assembly drawing or "
            f"the limits file that says {shared.designator} may mean any of them",
            parts=parts,
            working=tuple(WorkingLine("called so", kind, None, "") for kind in kinds),
            remedy=f"give all but one of {', '.join(parts)} a designator of its own, and export again",
            level="warning",
            subject=shared.designator,
        )
    for part_id in own:
        part = case.part(part_id).part
        if part.designator is None:
            yield case.finding(
                "designator-doubtful",
                f"{part_id} has no designator: no parts list and no assembly drawing can name it",
                parts=(part_id,),
                working=(WorkingLine("placed as", f"{part_id}, a {part.cell}", None, ""),),
                remedy=f"number {part_id} in the schematic, and export again",
                subject=part_id,
            )


def part_data_contradicts(case: Case) -> Iterator[Answer]:
    """Yield a finding for each part that netlist and parts list say different things of, for a symbol whose pin numbers are
    not the package's, and for ratings that cannot all be true."""
    for part_id in _needed(case):
        for one in case.differences.get(part_id, ()):
            yield case.finding(
                "part-data-contradicts",
                f"{part_id}: the netlist gives its {one.attribute.replace('_', ' ')} as {one.netlist}, the parts list "
                f"({one.file}:{one.line}) as {one.parts_list}; the netlist counts here",
                parts=(part_id,),
                working=(
                    WorkingLine("netlist", one.netlist, None, ""),
                    WorkingLine("parts list", one.parts_list, None, "", f"{one.file}:{one.line}"),
                ),
                remedy=f"make {one.attribute.replace('_', ' ')} of {part_id} {one.netlist} in both, or {one.parts_list}",
                level="warning",
                subject=f"{part_id} {one.attribute}",
            )
    for part_id in case.parts(*CHIP_ROLES):
        yield from _symbol_against_package(case, part_id)
        entry = case.part(part_id).entry
        for doubt in entry.contradictions if entry is not None else ():
            assert entry is not None
            kept = [entry.ratings[name] for name in doubt.ratings if name in entry.ratings]
            yield case.finding(
                "part-data-contradicts",
                f"the ratings of {part_id} ({entry.part_number}) cannot all be true: {doubt.says}",
                parts=(part_id,),
                working=tuple(
                    WorkingLine(name, "kept, the careful one", figure.value, "", figure.source)
                    for name, figure in zip(doubt.ratings, kept, strict=False)
                ),
                remedy=f"hold {', '.join(doubt.ratings)} of {entry.part_number} against its maker's data sheet",
                subject=f"{part_id} {' '.join(doubt.ratings)}",
            )


def _symbol_against_package(case: Case, part_id: str) -> Iterator[Answer]:
    """Yield a finding where the names of a symbol's pins count and their numbers say otherwise: pads go by number."""
    part = case.part(part_id)
    if part.entry is None or part.roles_from != BY_NAMES:
        return
    odds = numbers_at_odds(part.part, part.entry, FAMILY[part.kind])
    if not odds:
        return
    drawn, known = (", ".join(f"{pin[0]} {pin[told]}" for pin in odds) for told in (1, 2))
    yield case.finding(
        "part-data-contradicts",
        f"the symbol of {part_id} has the pins {drawn}, where the part data of {part.entry.part_number} (from "
        f"{part.entry.pins_source}) have {known}: on the board its terminals may be exchanged; the symbol's names count",
        parts=(part_id,),
        working=tuple(
            WorkingLine(
                f"pin {number}", f"{named} in the symbol, {of_data} in the part data", None, "", part.entry.pins_source
            )
            for number, named, of_data in odds
        ),
        remedy=f"hold the pin numbers of {part_id} against its package drawing, and take a symbol that has them; where the "
        f"symbol is right, state its pins in [pins.{toml_key(part.entry.part_number)}] of the limits file",
        subject=f"{part_id} pins",
    )


def _needed(case: Case) -> tuple[str, ...]:
    """Return the ids of the parts that the limiter's circuit is made of, in board order."""
    indices = {index for indices in case.limiter.elements.values() for index in indices} | set(
        case.bench.element_of.values()
    )
    parts = sorted({part for index in indices for part in case.board.elements[index].parts})
    return tuple(case.board.parts[part].id for part in parts)
