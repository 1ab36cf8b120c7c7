"""Which verdicts of a limiter rest on figures from memory: told by check, each figure with its parts."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from functools import cache

from protlint.checks.catalogue import load_catalogue
from protlint.checks.table import OF_NO_LIMITER, WITHOUT_SOLUTION
from protlint.partdata.ratings import DYNAMIC_FIGURES, STATIC_FIGURES
from protlint.report.shape import Document

FROM_MEMORY = "from memory"
"""What the line of a finding's working is called that names the figures from memory behind it."""

PIN_ORDER = "pin order"
"""Stands among a part's figures from memory where only a pin order from memory tells its pins apart."""

CURRENTS = "currents, and all that follows from them"
LOOP = "loop and delay"
OF_THE_LOOP = ("compensation-absent", "loop-undamped", "trips-on-peaks", "trips-late")
OF_KIND = {"sense-resistor-power": "resistor", "resistor-power": "resistor", "driver-overloaded": "ic"}
"""What kind of part a check is about, where others stand in the same roles."""

NOT_SOLVED_FOR = WITHOUT_SOLUTION | OF_NO_LIMITER
"""Checks that ask for connections and texts, not for currents."""


def on_memory(limiter: Document) -> dict[str, str]:
    """Return the figures from memory by what rests on them: the currents, the loop, a check; empty where nothing does."""
    if limiter["not_solved"]:
        return {}
    known = _known(limiter)
    figures: dict[str, Mapping[str, tuple[str, ...]]] = {
        CURRENTS: dict.fromkeys(limiter["roles"], (PIN_ORDER, *STATIC_FIGURES)),
        LOOP: dict.fromkeys(limiter["roles"], DYNAMIC_FIGURES),
    }
    found = {what: _named(limiter, known, by_role) for what, by_role in figures.items()}
    found |= {check: _looked_at(check, limiter, known) for check in limiter["asked"] if _applies(check, limiter)}
    return {what: text for what, text in found.items() if text}


def behind(check: str, limiter: Document, parts: Collection[str] | None = None) -> str:
    """Return all figures from memory that a check of a limiter rests on; of a finding's own ``parts`` only where given.

    What the currents rest on is told whatever the parts.
    """
    if check in NOT_SOLVED_FOR or limiter["not_solved"]:
        return ""
    by_check = on_memory(limiter)
    own = _looked_at(check, limiter, _known(limiter, parts)) if _applies(check, limiter) else ""
    rest = (by_check.get(one, "") for one in (CURRENTS, *([LOOP] if check in OF_THE_LOOP else [])))
    return "; ".join(text for text in (own, *rest) if text)


def resting(limiter: Document) -> list[str]:
    """Return a sentence for each set of figures from memory: the checks that rest on it, and the figures."""
    checks: dict[str, list[str]] = {}
    for what, text in on_memory(limiter).items():
        checks.setdefault(text, []).append(what)
    return [f"{', '.join(names)}: {text}" for text, names in checks.items()]


def remembered(limiter: Document) -> str:
    """Return what follows the word of a verdict that no finding qualifies, where it rests on figures from memory."""
    if limiter["not_solved"] or not any(part["from_memory"] for part in limiter["parts"]):
        return ""
    return {"passes": ", on figures from memory", "rests on assumptions": " and on figures from memory"}.get(
        limiter["verdict"], ""
    )


@cache
def in_use() -> frozenset[str]:
    """Return the names of all figures of part data that anything rests on."""
    looked_at = (names for by_role in _figures().values() for names in by_role.values())
    return frozenset({*STATIC_FIGURES, *DYNAMIC_FIGURES}.union(*looked_at))


@cache
def _figures() -> Mapping[str, Mapping[str, tuple[str, ...]]]:
    return {row.name: row.figures for row in load_catalogue().values()}


def _applies(check: str, limiter: Document) -> bool:
    """Tell whether a limiter has what a check of base stops is about."""
    stops = bool(limiter["roles"]["base_stop"] or limiter["roles"]["preset"])
    return {"base-stop-absent": not stops, "base-stop-low": stops, "base-stop-high": stops}.get(check, True)


def _looked_at(check: str, limiter: Document, known: Mapping[str, Sequence[str]]) -> str:
    """Name the figures from memory that a check looks at itself."""
    kind = OF_KIND.get(check)
    alike = {part["id"] for part in limiter["parts"] if kind in (None, part["kind"])}
    return _named(limiter, {part: names for part, names in known.items() if part in alike}, _figures().get(check, {}))


def _known(limiter: Document, parts: Collection[str] | None = None) -> dict[str, Sequence[str]]:
    return {part["id"]: part["from_memory"] for part in limiter["parts"] if parts is None or part["id"] in parts}


def _named(limiter: Document, known: Mapping[str, Sequence[str]], figures: Mapping[str, tuple[str, ...]]) -> str:
    """Name the figures from memory of the parts in some roles: ``tj_max, rth_jc of Q1, Q2; ib of Q3``."""
    parts: dict[tuple[str, ...], list[str]] = {}
    for role, names in figures.items():
        for part in limiter["roles"].get(role, ()):
            own = tuple(name for name in names if name in known.get(part, ()))
            if own and part not in parts.setdefault(own, []):
                parts[own].append(part)
    return "; ".join(f"{', '.join(own)} of {', '.join(ids)}" for own, ids in parts.items() if ids)
