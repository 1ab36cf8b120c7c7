"""Netlists of lamp outputs for tests of the whole road: invented boards, as many like channels as asked for.

Each channel is a sink: pass device, sense resistor, shunt without a base stop (an error with the part data of the demo
board) and drive resistor. Names may hold anything; they go through EDIF's percent codes.
"""

from __future__ import annotations

from collections.abc import Mapping

PARTS = """
    (cell NPN_BIPOLAR (cellType GENERIC) (view NETLIST (viewType NETLIST)
      (interface (port C) (port B) (port E))))
    (cell RES (cellType GENERIC) (view NETLIST (viewType NETLIST)
      (interface (port (rename &1 "1")) (port (rename &2 "2")))))
    (cell CONN (cellType GENERIC) (view NETLIST (viewType NETLIST)
      (interface (port (rename &1 "1")) (port (rename &2 "2")) (port (rename &3 "3")))))"""


def lamp_netlist(channels: int = 1, *, sense: str = "2R2", names: Mapping[str, str] | None = None) -> str:
    """Return a board's EDIF text; ``names`` replaces designators (``Q1``, ``R1S`` ...) and net names (``LAMP1`` ...)."""
    renamed = names or {}

    def shown(name: str) -> str:
        return coded(renamed.get(name, name))

    instances = [_instance("J1", "CONN", shown("J1"))]
    ground, supply = ["(portRef &3 (instanceRef J1))"], ["(portRef &2 (instanceRef J1))"]
    nets = []
    for number in range(1, channels + 1):
        parts = {"Q": "NPN_BIPOLAR", "L": "NPN_BIPOLAR", "S": "RES", "D": "RES"}
        types = {"Q": ("PART_NUMBER", "PHN60"), "L": ("PART_NUMBER", "PLN20"), "S": ("VALUE", sense), "D": ("VALUE", "330")}
        designators = {"Q": f"Q{number}", "L": f"Q{number}L", "S": f"R{number}S", "D": f"R{number}D"}
        for letter, cell in parts.items():
            power = '(property POWER (string "2W"))' if cell == "RES" else ""
            key, value = types[letter]
            properties = f'(property {key} (string "{value}")){power}'
            instances.append(_instance(f"I{letter}{number}", cell, shown(designators[letter]), properties))
        connector = f"J{number + 1}"
        instances.append(_instance(connector, "CONN", shown(connector)))
        pin = f"(portRef {{}} (instanceRef I{{}}{number}))"
        nets += [
            _net(f"LAMP{number}", shown(f"LAMP{number}"), f"(portRef &1 (instanceRef {connector}))", pin.format("C", "Q")),
            _net(f"BASE{number}", shown(f"BASE{number}"), pin.format("B", "Q"), pin.format("C", "L"), pin.format("&2", "D")),
            _net(f"SNS{number}", shown(f"SNS{number}"), pin.format("E", "Q"), pin.format("&1", "S"), pin.format("B", "L")),
            _net(f"CMD{number}", shown(f"CMD{number}"), f"(portRef &2 (instanceRef {connector}))", pin.format("&1", "D")),
        ]
        ground += [pin.format("&2", "S"), pin.format("E", "L")]
    nets += [_net("GND", "GND", *ground), _net("P12V", "+12V", *supply)]
    contents = "\n".join([*instances, *nets])
    return f"""(edif LAMPS (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))
  (library PARTS (edifLevel 0) (technology (numberDefinition)){PARTS})
  (library DESIGN (edifLevel 0) (technology (numberDefinition))
    (cell LAMPS (cellType GENERIC) (view NETLIST (viewType NETLIST) (interface) (contents
{contents}))))
  (design LAMPS (cellRef LAMPS (libraryRef DESIGN))))
"""


def coded(text: str) -> str:
    """Return a text for an EDIF string: what the format gives a meaning as percent codes, the rest as it is."""
    return "".join(f"%{ord(character)}%" if character in '"%\r\n' else character for character in text)


def lamp_limits(channels: int = 1) -> str:
    """Return the limits file of the board: every drive stated, so that nothing rests on an assumption."""
    drives = "".join(f'[drive.CMD{number}]\nlow = "0 V"\nhigh = "5 V"\n' for number in range(1, channels + 1))
    return f"""[board]
ambient = ["-10 degC", "27 degC", "70 degC"]
resistor_tolerance = "1 %"
vbe_spread = "30 mV"
{drives}[limiter."*"]
carry = "0.16 A"
cap = "0.45 A"
output = "1.5 V"
shorted_to = "+12V"
sink = "8 K/W"
"""


def _instance(identifier: str, cell: str, designator: str, properties: str = "") -> str:
    view = f"(viewRef NETLIST (cellRef {cell} (libraryRef PARTS)))"
    return f'      (instance {identifier} {view} (designator "{designator}"){properties})'


def _net(identifier: str, name: str, *pins: str) -> str:
    return f'      (net (rename {identifier} "{name}") (joined {" ".join(pins)}))'
