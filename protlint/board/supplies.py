"""Which nets are supplies: as the limits file says, else as a net's name states a voltage.

``+12V`` ``-15V`` ``3V3`` ``12V0`` ``V24`` ``P12V`` ``N15V`` ``VCC_3V3`` and the grounds state one; ``VCC``, ``VDD`` and
``VSS`` do not. A name that goes on to say what the net is for (``5V_EN``, ``12V_SENSE``, ``+24V_OUT``) is no supply's: it
is a signal, or an output that a limiter may stand in front of.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from functools import lru_cache

from protlint.board.graph import Supply
from protlint.limits import Limits, Range

_PLACE = r"(?:A|D|P|ANA|ANALOG|DIG|DIGITAL|MAIN|SYS|AUX|STBY|SB|RAW|UNREG|REG|FILT|F|IN|USB|BUS|DC|PWR|CH)"
"""What may follow a supply's voltage without making a signal of it."""
_TAIL = rf"(?:DC)?(?:[AD]|[_\-. ]?(?:{_PLACE}[0-9]?|[0-9]{{1,2}}))?"
_RAIL = r"(?:(?:A|D|P)?V(?:CC|DD)|VBUS|USB|PWR|SUPPLY|RAIL)[_\-. ]?"
_AMOUNT = r"(?:(?P<whole>[0-9]{1,3})[VP](?P<part>[0-9]{1,2})V?|(?P<plain>[0-9]{1,3}(?:[.,][0-9]{1,2})?)V)"
_STATED = re.compile(rf"(?:{_RAIL})?(?P<sign>[+\-PN]|POS|NEG)?{_AMOUNT}{_TAIL}", re.IGNORECASE)
_V_FIRST = re.compile(rf"V?(?P<sign>[+-])?V?(?P<plain>[0-9]{{2,3}}|[0-9]{{1,3}}[.,][0-9]{{1,2}}){_TAIL}", re.IGNORECASE)
_GROUND = re.compile(
    rf"(?:[ADPS]?GND(?:A|D|P|S|PWR)?[0-9]?|GROUND|0V[0-9]?)(?:[_\-. ]?(?:{_PLACE}|[0-9]{{1,2}}))?", re.IGNORECASE
)


def supply_of(names: Sequence[str], limits: Limits) -> Supply | None:
    """Return what holds a net that goes by these names, or None where nothing says that it is held.

    The limits file counts before names, whatever their order; its keys fold case. A net that it names in a drive's or
    limiter's table is driven or an output, whatever voltage its name states.
    """
    stated = _by_fold(tuple(limits.supplies_V.items())) if limits.supplies_V else {}
    for name in names if stated else ():
        if name.casefold() in stated:
            return Supply(stated[name.casefold()], "limits file")
    voltage_V = next((voltage_V for voltage_V in map(stated_voltage, names) if voltage_V is not None), None)
    folded = {name.casefold() for name in names} if voltage_V is not None else ()
    if voltage_V is None or any(key.casefold() in folded for key in (*limits.drives, *limits.limiters)):
        return None
    return Supply(Range(voltage_V, voltage_V, voltage_V), "net name")


@lru_cache(maxsize=16)
def _by_fold(supplies: tuple[tuple[str, Range], ...]) -> dict[str, Range]:
    return {name.casefold(): voltage for name, voltage in supplies}


@lru_cache(maxsize=65536)
def stated_voltage(name: str) -> float | None:
    """Return the voltage that a net's name states, or None. Only the last step of a name with a path counts."""
    name = name.strip().rpartition("/")[2].replace("−", "-")
    if _GROUND.fullmatch(name):
        return 0.0
    found = _STATED.fullmatch(name)
    if found is None and name[:1] in "Vv+-":
        found = _V_FIRST.fullmatch(name) if "V" in name[:2].upper() else None
    if found is None:
        return None
    named = found.groupdict()
    if named.get("whole") and float(named["whole"]) >= 5.0 and named["part"] in ("1", "2", "3", "4"):
        return None  # 12V2 is the second 12 V supply as often as 12.2 V
    amount = f"{named['whole']}.{named['part']}" if named.get("whole") else named["plain"].replace(",", ".")
    negative = (named["sign"] or "").upper() in ("-", "N", "NEG")
    return -float(amount) if negative and float(amount) else float(amount)
