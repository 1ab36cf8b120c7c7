"""What a part is, and which of its pins is which.

The kind comes from the part data, then from what the properties and the library cell's name say, then from the class letter
of the designator (IEEE 315, and the letters of older European and Russian drawings) together with the pins: never from the
letter alone. Pin roles come from the limits file, the part data, the pins' names, or properties that name them. Numbers
alone tell nothing: such a part has a kind and no roles.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from string import ascii_letters

from protlint.limits import Limits, fits
from protlint.netlist.model import Part
from protlint.partdata.book import PartEntry

Roles = dict[str, tuple[int, ...]]


@dataclass(frozen=True, slots=True)
class Identity:
    """What a part was taken for.

    ``roles`` maps a terminal's role to the positions of its pins in ``Part.pins``; empty where it cannot be known.
    ``sections`` holds the roles of each device where one package has several, and ``roles`` is then empty. ``kind_from``
    and ``roles_from`` say in plain words how they are known.
    """

    kind: str
    kind_from: str
    roles: Mapping[str, tuple[int, ...]] = field(default_factory=dict)
    roles_from: str = "no roles"
    sections: tuple[Mapping[str, tuple[int, ...]], ...] = ()


_BIPOLAR = ("npn", "pnp", "npn-darlington", "pnp-darlington")
_MOSFET = ("nmos", "pmos")
_TWO_TERMINALS = ("resistor", "capacitor", "inductor", "fuse", "link")
_PIN_NAMES: dict[str, dict[str, str]] = {
    "bipolar": {
        "b": "base", "base": "base", "basis": "base", "c": "collector", "coll": "collector", "col": "collector",
        "collector": "collector", "e": "emitter", "emit": "emitter", "emitter": "emitter",
    },
    "mosfet": {"g": "gate", "gate": "gate", "d": "drain", "drain": "drain", "s": "source", "source": "source"},
    "diode": {
        "a": "anode", "an": "anode", "anode": "anode", "+": "anode", "k": "cathode", "c": "cathode", "ca": "cathode",
        "cat": "cathode", "kat": "cathode", "cath": "cathode", "cathode": "cathode", "kathode": "cathode", "-": "cathode",
    },
    "thyristor": {
        "a": "anode", "anode": "anode", "mt2": "anode", "k": "cathode", "c": "cathode", "cathode": "cathode",
        "mt1": "cathode", "g": "gate", "gate": "gate",
    },
    "two": {"1": "1", "2": "2", "+": "1", "-": "2", "p": "1", "n": "2", "pos": "1", "neg": "2", "plus": "1", "minus": "2"},
}  # fmt: skip
_FAMILY = {
    **dict.fromkeys(_BIPOLAR, "bipolar"),
    **dict.fromkeys(_MOSFET, "mosfet"),
    **dict.fromkeys(_TWO_TERMINALS, "two"),
    "diode": "diode",
    "zener": "diode",
    "thyristor": "thyristor",
}
_NEEDED = {
    "bipolar": ("collector", "base", "emitter"), "mosfet": ("drain", "gate", "source"), "diode": ("anode", "cathode"),
    "thyristor": ("anode", "cathode", "gate"), "two": ("1", "2"),
}  # fmt: skip
_MOST_PINS = {"two": 2, "diode": 3, "thyristor": 4}


def _word(words: str) -> str:
    return rf"(?<![a-z])(?:{words})(?![a-z])"


def _channel(letter: str) -> str:
    channel = rf"(?<![a-z]){letter}[ _-]?(?:ch(?:an(?:nel)?)?(?![a-z])|(?:ch(?:an(?:nel)?)?[ _-]?)?(?:mos|fet))"
    return rf"{channel}|(?:mos(?:fet)?|fet)[ _-]?{letter}(?![a-z])"


_SAYS: tuple[tuple[re.Pattern[str], str, str], ...] = tuple(
    (re.compile(pattern, re.IGNORECASE), kind, why)
    for pattern, kind, why in (
        (rf"jfet|igbt|phototransistor|{_word('njf|pjf|ujt|njfet|pjfet')}", "unknown", "a device that is not modelled"),
        (r"^(?:P?DT[ABCD][0-9]{3}|MUN[25][0-9]{3})", "unknown", "a transistor with resistors built in"),
        (_word("opto|optocoupler|photocoupler"), "ic", ""),
        (rf"thermistor|varistor|{_word('ntc|ptc|vdr|mov')}", "unknown", "its resistance is not constant"),
        (rf"potentiometer|trimmer|trimpot|rheostat|{_word('pot')}", "unknown", "its setting is not known"),
        (r"res(?:istor)?s?[ _-]?(?:net|pack|array)|^r[ _-]?(?:pack|net)|^rn[0-9]*$", "unknown", "a resistor network"),
        (r"bridge", "unknown", "a bridge of diodes"),
        (r"npn.*pnp|pnp.*npn", "unknown", "two transistors of either polarity"),
        (r"npn.*darl|darl.*npn", "npn-darlington", ""),
        (r"pnp.*darl|darl.*pnp", "pnp-darlington", ""),
        (rf"npn|{_word('bjtn')}", "npn", ""),
        (rf"pnp(?!n)|{_word('bjtp')}", "pnp", ""),
        (_channel("n"), "nmos", ""),
        (_channel("p"), "pmos", ""),
        (rf"thyristor|{_word('scr|triac')}", "thyristor", ""),
        (rf"zener|transil|{_word('tvs')}|^BZ[A-Z][0-9]{{2}}", "zener", ""),
        (rf"diode|schottky|rectifier|{_word('led')}|^1N[0-9]{{3}}|^(?:BA[STV]|BY[VWX])[0-9]{{2}}", "diode", ""),
        (r"^2S[CD][0-9]{3}", "npn", ""),
        (r"^2S[AB][0-9]{3}", "pnp", ""),
        (r"^2SK[0-9]{3}", "nmos", ""),
        (r"^2SJ[0-9]{3}", "pmos", ""),
        (rf"ferrite|{_word('bead')}|@ ?[0-9.]+ ?MHz", "link", "a ferrite bead: no resistance at direct current"),
        (rf"{_word('fuse|polyfuse')}", "fuse", ""),
        (rf"test[ _-]?(?:point|pad)|mounting[ _-]?hole|fiducial|{_word('tp|hole')}", "test point", ""),
        (r"jumper|net[ _-]?tie|^(?:link|short)(?![a-z])", "link", ""),
        (rf"resistor|{_word('res')}|^r(?:[ _-]?[0-9]{{4}})?$", "resistor", ""),
        (rf"capacitor|{_word('cap')}|^c(?:[ _-]?[0-9]{{4}})?$|^c(?:ap)?[ _-]?(?:pol|np)", "capacitor", ""),
        (rf"inductor|choke|{_word('ind|coil')}|^l$", "inductor", ""),
        (rf"op[ _-]?amp|regulator|comparator|{_word('ic')}", "ic", ""),
        (rf"connector|header|terminal|{_word('conn?|jack|plug|socket')}", "connector", ""),
        (_word("relay|switch|crystal|xtal|transformer|lamp|battery|speaker|motor|buzzer"), "unknown", "not modelled"),
    )
)  # fmt: skip
"""What words tell of a kind, the first that fits; JIS C 7012 numbers (2SA to 2SK) and JEDEC 1N tell it by themselves."""

_TELLING = ("device", "type", "part type", "part_type", "class", "category", "description", "desc", "value", "comment")
"""Properties whose words may name the kind."""

_LETTERS: dict[str, str] = {
    **dict.fromkeys(("q", "t", "tr", "vt", "v"), "transistor"),
    **dict.fromkeys(("d", "cr", "vd", "led", "ld"), "diode"),
    **dict.fromkeys(("dz", "zd", "vz", "z"), "zener"),
    "r": "resistor", "c": "capacitor", "l": "inductor",
    **dict.fromkeys(("f", "fu"), "fuse"),
    **dict.fromkeys(("fb", "jp", "lk", "nt", "w", "jmp"), "link"),
    **dict.fromkeys(("tp", "mh", "h", "fid"), "test point"),
    **dict.fromkeys(("j", "p", "x", "xs", "xp", "con", "cn", "tb"), "connector"),
    **dict.fromkeys(("u", "ic", "n", "a", "da", "dd", "ar"), "ic"),
}  # fmt: skip
"""IEEE 315 / ASME Y14.44 class letters and their older European and Russian kin."""


def identify(part: Part, part_number: str | None, entry: PartEntry | None, limits: Limits) -> Identity:
    """Return what a part is and which of its pins is which."""
    kind, kind_from = _kind(part, part_number, entry)
    family = _FAMILY.get(kind) or (_family_by_names(part) if kind_from.startswith(_NO_POLARITY) else None)
    for table, roles_from in _tables(part, part_number, entry, limits, family):
        roles, sections = _by_table(part, table)
        if roles or sections:
            return Identity(kind, kind_from, roles, roles_from, sections)
    if family is None:
        return Identity(kind, kind_from)
    if family == "two" and len(part.pins) <= 2:
        return Identity(kind, kind_from, _two_terminals(part), "two terminals, alike")
    roles, sections = _by_names(part, family)
    if roles or sections:
        return Identity(kind, kind_from, roles, "pin names", sections)
    return Identity(kind, kind_from, {}, "the pins are numbered and nothing says which is which")


_NO_POLARITY = "a transistor of unknown polarity"


def _kind(part: Part, part_number: str | None, entry: PartEntry | None) -> tuple[str, str]:
    """Return a part's kind and how it is known."""
    if entry is not None:
        return entry.kind, "part data"
    texts = [(item.name, str(item.value)) for key in _TELLING if (item := part.properties.get(key)) is not None]
    texts += [("part number", part_number)] if part_number else []
    for name, text in (*texts, ("library cell", part.cell)):
        kind, why = _by_words(text)
        family = _FAMILY.get(kind)
        if kind and len(part.pins) <= _MOST_PINS.get(family or "", len(part.pins)):
            told = f"{name} {text!r}" if len(text) <= 40 else name
            return _settled(part, kind, f"{told}{': ' if why else ''}{why}")
    return _by_letter(part)


@lru_cache(maxsize=8192)
def _by_words(text: str) -> tuple[str, str]:
    for pattern, kind, why in _SAYS:
        if pattern.search(text):
            return kind, why
    return "", ""


def class_letters(part: Part) -> str:
    """Return the letters that a part's designator begins with."""
    name = (part.designator or part.id).rpartition("/")[2]
    return name[: len(name) - len(name.lstrip(ascii_letters))]


def _by_letter(part: Part) -> tuple[str, str]:
    """Return the kind by the designator's class letter and what its pins say to that."""
    letters = class_letters(part)
    kind = _LETTERS.get(letters.casefold(), "")
    told = f"class letter {letters} and its pins"
    if kind == "transistor":
        family = _family_by_names(part)
        return "unknown", f"{_NO_POLARITY} ({told})" if family else "a class letter and pins that do not tell a transistor"
    if kind in ("", "ic"):
        return ("ic", told) if kind and part.pins else ("unknown", "nothing tells what it is")
    if _FAMILY.get(kind) == "two" and len(part.pins) > 2:
        return "unknown", f"a {kind} with {len(part.pins)} pins"
    if kind in ("diode", "zener") and len(part.pins) > _MOST_PINS["diode"]:
        return "unknown", f"a {kind} with {len(part.pins)} pins"
    return _settled(part, kind, told)


def _settled(part: Part, kind: str, told: str) -> tuple[str, str]:
    """Return the kind after what only this part can tell: a diode whose value is a zener voltage, a test point."""
    values = (item.value for key in ("value", "comment") if (item := part.properties.get(key)) is not None)
    if kind == "diode" and any(re.match(r"[0-9]+V[0-9]", str(value).strip(), re.IGNORECASE) for value in values):
        return "zener", f"{told}, and a value in volts"
    if kind == "test point":
        joins_nothing = len({pin.net for pin in part.pins}) <= 1
        return ("link", f"{told}: a test point, which drives nothing") if joins_nothing else ("connector", told)
    return kind, told


def _family_by_names(part: Part) -> str | None:
    """Return ``bipolar`` or ``mosfet`` where the pins bear all the names of such a transistor."""
    for family in ("bipolar", "mosfet"):
        roles, sections = _by_names(part, family)
        if sections or all(role in roles for role in _NEEDED[family]):
            return family
    return None


def _tables(
    part: Part, part_number: str | None, entry: PartEntry | None, limits: Limits, family: str | None
) -> Iterator[tuple[Mapping[str, str], str]]:
    """Yield the tables of pin roles that speak of a part, the strongest first.

    Pin orders that protlint itself knows from memory give way to pins that bear their names.
    """
    for pattern, table in limits.pins.items():
        if fits(pattern, part.cell) or (part_number is not None and fits(pattern, part_number)):
            yield table, "limits file"
    if entry is not None and entry.pins:
        named = family is not None and family != "two" and any(_by_names(part, family))
        if not (named and entry.pins_source == "memory"):
            yield entry.pins, f"part data, pin order from {entry.pins_source}"
    stated = {
        found[1]: str(item.value)
        for key, item in part.properties.items()
        if key.startswith("pin") and (found := re.fullmatch(r"pin[ _]?([0-9]+)", key))
    }
    names = _PIN_NAMES.get(family or "", {})
    if stated and all(value.casefold() in names for value in stated.values()):
        yield {pin: names[value.casefold()] for pin, value in stated.items()}, "pin properties"


def _by_table(part: Part, table: Mapping[str, str]) -> tuple[Roles, tuple[Roles, ...]]:
    """Return the roles a table of pin numbers or names gives, and those of each section where it tells sections apart."""
    by_fold = {pin.casefold(): role for pin, role in table.items()}
    grouped: dict[str, dict[str, list[int]]] = {}
    for position, pin in enumerate(part.pins):
        role = by_fold.get((pin.number or "").casefold()) or by_fold.get(pin.name.casefold())
        if role and role != "none":
            name, _, section = role.partition(".")
            grouped.setdefault(section, {}).setdefault(name, []).append(position)
    return _grouped(grouped)


def _by_names(part: Part, family: str) -> tuple[Roles, tuple[Roles, ...]]:
    return _roles_of(tuple(pin.name for pin in part.pins), family)


@lru_cache(maxsize=4096)
def _roles_of(pins: tuple[str, ...], family: str) -> tuple[Roles, tuple[Roles, ...]]:
    """Return the roles that pin names tell: one device, or several where every terminal's name is numbered.

    A terminal that several numbered ones share (a common cathode) belongs to each. Nothing is returned where a terminal is
    missing although a pin's name tells nothing.
    """
    names = _PIN_NAMES[family]
    grouped: dict[str, dict[str, list[int]]] = {}
    for position, pin in enumerate(pins):
        name = pin.strip().casefold()
        numbered = re.fullmatch(r"(.*?[^0-9])[ _.@-]?([0-9]*)", name)
        stem, number = (numbered[1], numbered[2]) if numbered and name not in names else (name, "")
        role = names.get(stem) or names.get(stem.rstrip(" _.@-"))
        if role:
            grouped.setdefault(number, {}).setdefault(role, []).append(position)
    known = {role for section in grouped.values() for role in section}
    needed = _NEEDED[family]
    seen = sum(len(positions) for section in grouped.values() for positions in section.values())
    if not known or (seen < len(pins) and not known.issuperset(needed)):
        return {}, ()
    shared = grouped.get("", {})
    several = {number: section for number, section in grouped.items() if number}
    whole = all(set(section) | set(shared) >= set(needed) for section in several.values())
    if len(several) > 1 and whole and (not shared or (family == "diode" and len(shared) == 1)):
        return _grouped({number: {**shared, **section} for number, section in several.items()})
    merged: dict[str, list[int]] = {}
    for section in grouped.values():
        for role, positions in section.items():
            merged.setdefault(role, []).extend(positions)
    return _grouped({"": merged})


def _grouped(grouped: Mapping[str, Mapping[str, list[int]]]) -> tuple[Roles, tuple[Roles, ...]]:
    sections = tuple(
        {role: tuple(sorted(positions)) for role, positions in grouped[section].items()} for section in sorted(grouped)
    )
    return (sections[0], ()) if len(sections) == 1 else ({}, sections)


def _two_terminals(part: Part) -> Roles:
    """Return the ends of a part with two pins: as named, else in the order of the file."""
    names = [_PIN_NAMES["two"].get(pin.name.strip().casefold()) for pin in part.pins]
    if len(set(names)) == len(names) and None not in names:
        return {str(name): (position,) for position, name in enumerate(names)}
    return {str(position + 1): (position,) for position in range(len(part.pins))}
