"""What a part is.

The kind comes from the part data, then from what the properties and the library cell's name say, then from the class letter
of the designator (IEEE 315, and the letters of older European and Russian drawings) together with the pins: never from the
letter alone. Which pin is which, ``protlint.board.pins`` tells; a part may have a kind and no roles.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache

from protlint.board.pins import FAMILY, NO_ROLES, family_by_names, roles_of_pins
from protlint.limits import Limits
from protlint.netlist.model import Part
from protlint.partdata.book import PartEntry


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
    roles_from: str = NO_ROLES
    sections: tuple[Mapping[str, tuple[int, ...]], ...] = ()


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
        (rf"zener|transil|{_word('tvs')}|^BZ[A-Z][0-9]{{2}}|^(?:SM[ABCF]J|P[46]KE|P[46]SM[AB]J?|1\.?5KE)[0-9]", "zener", ""),
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


_DESIGNATOR = re.compile(
    r"([A-Za-z]+)(?:(?:[0-9]+|\?)(?:[A-Za-z][0-9]*)?)?(?:\[[0-9]+\](?:#[0-9]+)?|[^A-Za-z0-9\[\]][^\[\]]*)?"
)
"""Class letters, a number or none, a section's letter; then a place in an array, or what schematics add behind a mark
(``R12_CH3``, ``U2-1``, ``Q1#2``). Words with places in them are how synthesised logic names what it places."""


def identify(part: Part, part_number: str | None, entry: PartEntry | None, limits: Limits) -> Identity:
    """Return what a part is and which of its pins is which."""
    kind, kind_from = _kind(part, part_number, entry)
    family = FAMILY.get(kind) or (family_by_names(part) if kind_from.startswith(_NO_POLARITY) else None)
    roles, sections, roles_from = roles_of_pins(part, part_number, entry, limits, family)
    return Identity(kind, kind_from, roles, roles_from, sections)


UNTOLD_TRANSISTOR = "a class letter and pins that do not tell a transistor"
"""What is said of a part that goes by a transistor's class letter and has only numbers for pins."""

_NO_POLARITY = "a transistor of unknown polarity"


def _kind(part: Part, part_number: str | None, entry: PartEntry | None) -> tuple[str, str]:
    """Return a part's kind and how it is known."""
    if entry is not None:
        return entry.kind, "part data"
    texts = [(item.name, str(item.value)) for key in _TELLING if (item := part.properties.get(key)) is not None]
    whole = [*([("part number", part_number)] if part_number else []), ("library cell", part.cell)]
    if _is_connector(part, [text for _, text in whole]):
        texts = []
    for name, text in (*texts, *whole):
        kind, why = _by_words(text)
        family = FAMILY.get(kind)
        if kind and len(part.pins) <= _MOST_PINS.get(family or "", len(part.pins)):
            told = f"{name} {text!r}" if len(text) <= 40 else name
            return _settled(part, kind, f"{told}{': ' if why else ''}{why}")
    return _by_letter(part)


def _is_connector(part: Part, names: Sequence[str]) -> bool:
    """Tell whether class letter and cell or part number make a part a connector: its value then says what is plugged in.

    ``J3`` of a cell ``CONN2`` with the value ``SPEAKER`` or ``LED STRING`` is neither.
    """
    letter = _LETTERS.get(class_letters(part).casefold())
    return letter == "connector" and any(_by_words(text)[0] == "connector" for text in names)


_LONGEST = 200
"""Of a longer text only its beginning is looked at: two words far apart in it tell nothing, and seeking them takes long."""


@lru_cache(maxsize=8192)
def _by_words(text: str) -> tuple[str, str]:
    for pattern, kind, why in _SAYS:
        if pattern.search(text, 0, _LONGEST):
            return kind, why
    return "", ""


def class_letters(part: Part) -> str:
    """Return the letters that a part's designator begins with, none where it is no designator but a name."""
    designator = _DESIGNATOR.fullmatch((part.designator or part.id).rpartition("/")[2])
    return designator[1] if designator else ""


def _by_letter(part: Part) -> tuple[str, str]:
    """Return the kind by the designator's class letter and what its pins say to that."""
    letters = class_letters(part)
    kind = _LETTERS.get(letters.casefold(), "")
    told = f"class letter {letters} and its pins"
    if kind == "transistor":
        family = family_by_names(part)
        return "unknown", f"{_NO_POLARITY} ({told})" if family else UNTOLD_TRANSISTOR
    if kind in ("", "ic"):
        return ("ic", told) if kind and part.pins else ("unknown", "nothing tells what it is")
    if FAMILY.get(kind) == "two" and len(part.pins) > 2:
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
