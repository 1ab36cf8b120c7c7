"""Which of EDIF's keywords the reader uses, which it refuses, and what can stand inside what. All in lower case."""

from __future__ import annotations

# fmt: off
USED = frozenset((
    "edif", "edifversion", "ediflevel", "keywordmap", "keywordlevel", "status", "written", "program", "version",
    "external", "library", "technology", "numberdefinition", "scale", "unit", "design",
    "cell", "celltype", "viewmap", "view", "viewtype", "interface", "contents", "page", "offpageconnector",
    "port", "portbundle", "listofports", "direction", "designator",
    "instance", "portinstance", "net", "netbundle", "listofnets", "joined", "portref", "portlist", "instanceref",
    "viewref", "viewlist", "cellref", "libraryref", "globalportref", "member", "rename", "name", "array",
    "portmap", "portgroup", "keywordalias",
    "property", "parameter", "parameterassign", "string", "stringdisplay", "integer", "number", "e",
    "boolean", "true", "false", "minomax", "mnm", "undefined", "unconstrained", "point", "pt",
))
# fmt: on
"""Everything else is passed over, with all that stands in it."""

REFUSED = {
    "keyworddefine": "keyword macros",
    "instancebackannotate": "back-annotations in a viewMap",
    "netbackannotate": "back-annotations in a viewMap",
    "portbackannotate": "back-annotations in a viewMap",
    "if": "conditions and loops (EDIF level 2)",
    "iterate": "conditions and loops (EDIF level 2)",
    "while": "conditions and loops (EDIF level 2)",
}
"""What would change the netlist if it were passed over, and is not read."""

LEVELS = {
    "edif": 0,
    "library": 1,
    "external": 1,
    "design": 1,
    "cell": 2,
    "view": 3,
    "interface": 4,
    "contents": 4,
    "page": 5,
    "instance": 6,
    "net": 6,
    "port": 6,
    "joined": 7,
}
"""How deep a definition stands: one inside another of the same level or a deeper one means that a parenthesis is missing."""


def may_hold(holder: str, inner: str) -> bool:
    """Tell whether ``inner`` may stand somewhere inside ``holder``; both are keywords of :data:`LEVELS`."""
    return LEVELS[inner] > LEVELS[holder] or (holder, inner) == ("net", "instance")
