"""What the survey shows of the reading: how much there is, and how designators and pin numbers were found."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

from protlint.findings import some_of
from protlint.netlist.definitions import Edif, Library
from protlint.netlist.flatten import Flat

_LIBRARIES_SHOWN = 12


def facts_of(edif: Edif, flat: Flat, encoding: str) -> dict[str, str]:
    """Return plain names and plain sentences, in the order to show them."""
    joints = sum(item is None for cell in flat.cells for item in cell.items)
    pins = [pin for part in flat.parts for pin in part.pins]
    short = sum(len(net.pins) < 2 for net in flat.nets)
    numbers, names = sum(pin.number is not None for pin in pins), sum(not pin.name.isdecimal() for pin in pins)
    facts = {
        "format": f"EDIF 2 0 0, level {edif.level}, read as {encoding}",
        "written by": edif.program or "not stated",
        "design": f"{flat.design}, cell {flat.cell}; chosen by {flat.chosen_by}",
        "libraries": _libraries(edif.libraries),
        "drawn as": _shape(flat),
        "parts": f"{len(flat.parts)} of {_counted(len({(part.library, part.cell) for part in flat.parts}), 'cell')}",
        "nets": f"{len(flat.nets)}, {short or 'none'} of them with fewer than two pins",
        "pins": f"{len(pins)} connected",
        "designators": _designators(flat),
        "pin numbers": f"known of {numbers} of {_counted(len(pins), 'pin')}",
        "pin names": f"more than a number at {names} of {_counted(len(pins), 'pin')}",
    }
    alike = [name for name, count in Counter(net.name for net in flat.nets).items() if count > 1]
    if alike:
        facts["nets named alike"] = f"{some_of(alike)}: nothing joins them, so they are kept apart"
    if joints:
        facts["rippers and ties"] = f"{joints}, which join nets and are no parts"
    shorted = sum(cell.shorted for cell in flat.cells)
    if shorted:
        facts["joined inside"] = f"{_counted(shorted, 'part')}, whose cells say that some of their pins are one"
    sections = [sections for cell in flat.cells for sections in cell.packages]
    if sections:
        facts["sections"] = f"{_counted(sum(sections), 'part')} are sections of {_counted(len(sections), 'package')}"
    return facts


def _libraries(libraries: Sequence[Library]) -> str:
    told = [
        f"{each.name.text} ({'external, ' if each.external else ''}{_counted(len(each.cells), 'cell')})"
        for each in libraries
    ]
    return some_of(told, _LIBRARIES_SHOWN) or "none"


def _shape(flat: Flat) -> str:
    views = [cell.block.view for cell in flat.cells]
    kinds = sorted({view.kind.upper() or "unnamed" for view in views if view is not None})
    pages = sum(view.contents.pages for view in views if view is not None and view.contents is not None)
    shape = f"{' and '.join(kinds)} views" if kinds else "a cell without contents"
    shape += f", {_counted(pages, 'page')}" if pages else ""
    return shape + (
        f", {flat.levels} levels of hierarchy, {_counted(len(flat.cells), 'cell')}" if flat.levels > 1 else ", flat"
    )


def _designators(flat: Flat) -> str:
    without = sum(part.designator is None for part in flat.parts)
    if not flat.designated:
        source = "no designator in the file: the names of the instances are taken"
    else:
        source = f"{len(flat.parts) - without} stated in the file"
        in_properties = sum(cell.in_properties for cell in flat.cells)
        source += f", {in_properties} of them in a property" if in_properties else ""
    return f"{source}, {_counted(without, 'part')} without one" if without else source


def _counted(count: int, word: str) -> str:
    return f"{count} {word}" if count == 1 else f"{count} {word}s"
