"""Two reports compared: what a revision changed on the limiters, which part did it, and which findings are new or gone.

``protlint.pairing`` finds what is held against what. Both sides are reports in the shape of ``review-1.schema.json``, what
comes of them has that of ``compare-1.schema.json``, both in ``protlint/report``.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from protlint.findings import LEVELS
from protlint.pairing import Pair, Report, matched, matched_boards, type_of

SAME = 1e-3
"""Relative change below which a figure counts as the same: the rounding of reports and solvers stays far below it."""

FIGURES = ("carries_A", "most_A", "holds_A", "damping", "pass_power_W")
"""What a comparison follows, at usual ambient."""

NO_BOARD: Report = {"netlist": None, "limiters": [], "findings": [], "remarks": []}
"""Stands for a board that is on the other side only."""


def compare_together(before: Report, after: Report) -> dict[str, Any]:
    """Return what changed from one report of several netlists to another.

    A board that is on one side only has all its limiters and findings added and new, or removed and gone. One that could
    not be reviewed on either side is not compared.

    Raises
    ------
    KeyError, TypeError, IndexError, AttributeError : one of them is not a report of several netlists.
    """
    compared, not_compared = [], []
    for pair in matched_boards(*([*side["boards"], *side["unread"]] for side in (before, after))):
        unread = [one for one in pair if one is not None and "netlist" not in one]
        not_compared += [dict(one) for one in unread if one not in not_compared]
        if not unread:
            compared.append(compare(*(NO_BOARD if one is None else one for one in pair)))
    return {"compare": 1, "boards": compared, "not_compared": not_compared, "remarks": _remarks(before, after)}


def compare(before: Report, after: Report) -> dict[str, Any]:
    """Return what changed from one report to the other, as plain data.

    Raises
    ------
    KeyError, TypeError, IndexError : one of them is not a report of a single netlist.
    """
    pairs, removed, added = matched(before["limiters"], after["limiters"])
    changes = [_change(old, new) for old, new in pairs]
    changed = [change for change in changes if any(change[what] for what in ("parts", "figures", "words", "needs"))]
    return {
        "compare": 1,
        "before": before["netlist"] and dict(before["netlist"]),
        "after": after["netlist"] and dict(after["netlist"]),
        "limiters": {
            "added": [{"id": one["id"], "topology": one["topology"], "verdict": one["verdict"]} for one in added],
            "removed": [{"id": one["id"], "topology": one["topology"], "verdict": one["verdict"]} for one in removed],
            "changed": changed,
            "unchanged": len(changes) - len(changed),
        },
        "findings": _findings(before, after, pairs),
        "remarks": _remarks(before, after),
    }


def _remarks(before: Report, after: Report) -> dict[str, list[str]]:
    """Return the remarks that only one side makes."""
    return {
        "new": [text for text in after["remarks"] if text not in before["remarks"]],
        "gone": [text for text in before["remarks"] if text not in after["remarks"]],
    }


def _change(old: Report, new: Report) -> dict[str, Any]:
    """Return what is different in one limiter; ``parts`` stand with the one that moved holds most first."""
    parts = _changed_parts(old, new)
    figures = {}
    for name in FIGURES:
        was, now = _figure(old, name), _figure(new, name)
        if (was is None) != (now is None) or (was is not None and now is not None and not _same(was, now)):
            figures[name] = {"before": was, "after": now}
    words = {
        key: {"before": old[key], "after": new[key]} for key in ("topology", "verdict") if old[key] != new[key]
    }  # fmt: skip
    needs = {
        key: {"before": old["needs"][key], "after": new["needs"][key]}
        for key in old["needs"]
        if old["needs"][key] != new["needs"].get(key)
    }
    return {
        "before": old["id"],
        "after": new["id"],
        "words": words,
        "figures": figures,
        "parts": sorted(parts, key=lambda part: -abs(part["moves_holds"] or 0.0)),
        "needs": needs,
    }


def _figure(limiter: Report, name: str) -> float | None:
    if name == "damping":
        value = limiter["loop"]["least_damping"]
    elif name == "pass_power_W":
        value = _pass_power_W(limiter)
    else:
        value = limiter["currents"][len(limiter["currents"]) // 2][name]
    return None if value is None else float(value)


def _pass_power_W(limiter: Report) -> float | None:
    """Return the dissipation of the hottest pass device in the held short; a Darlington part is two devices."""
    point = limiter["held_short"]
    if point is None:
        return None
    powers = {device["device"]: device["power_W"] for device in point["devices"] if device["power_W"] is not None}
    return max(
        (powers[name] + powers.get(f"{name} driver", 0.0) for name in limiter["roles"]["pass"] if name in powers),
        default=None,
    )


def _same(was: float, now: float) -> bool:
    return abs(now - was) <= SAME * max(abs(was), abs(now))


def _changed_parts(old: Report, new: Report) -> list[dict[str, Any]]:
    """Pair the parts of each role, equal ones first, and return those that changed, came or went."""
    changed = []
    roles = dict.fromkeys(part["role"] for one in (old, new) for part in one["parts"])
    for role in roles:
        ours = [part for part in old["parts"] if part["role"] == role]
        theirs = [part for part in new["parts"] if part["role"] == role]
        for part in list(ours):
            same = next((other for other in theirs if type_of(other) == type_of(part)), None)
            if same is not None:
                ours.remove(part)
                theirs.remove(same)
        for was, now in zip(ours, theirs, strict=False):
            changed.append(_changed_part(role, was, now, old))
        changed += (_changed_part(role, part, None, old) for part in ours[len(theirs) :])
        changed += (_changed_part(role, None, part, old) for part in theirs[len(ours) :])
    return changed


def _changed_part(role: str, was: Report | None, now: Report | None, old: Report) -> dict[str, Any]:
    keys = ("id", "kind", "part_number", "value", "unit")
    return {
        "role": role,
        "before": None if was is None else {key: was[key] for key in keys},
        "after": None if now is None else {key: now[key] for key in keys},
        "moves_holds": _moves_holds(was, now, old),
    }


def _moves_holds(was: Report | None, now: Report | None, old: Report) -> float | None:
    """Return by how much (relative) a changed resistance moves holds: its ratio to the power of its sensitivity."""
    if was is None or now is None or not was["value"] or not now["value"]:
        return None
    found = [row["relative"] for row in old["sensitivities"] if row["device"] == was["id"] and row["parameter"] == "R"]
    if not found or found[0] is None:
        return None
    return float(f"{(now['value'] / was['value']) ** found[0] - 1.0:.6g}")


def _findings(before: Report, after: Report, pairs: Sequence[Pair]) -> dict[str, Any]:
    """Sort the findings into new, gone, risen (to a higher level) and unchanged."""
    place_before = {old["id"]: place for place, (old, _) in enumerate(pairs)}
    place_after = {new["id"]: place for place, (_, new) in enumerate(pairs)}
    renumbered = any(old["id"] != new["id"] for old, new in pairs)
    roles_before, roles_after = _roles(before), _roles(after)
    waiting: dict[Any, list[Report]] = {}
    for finding in before["findings"]:
        waiting.setdefault(_key(finding, place_before, roles_before, renumbered), []).append(finding)
    new: list[Report] = []
    risen: list[dict[str, Any]] = []
    unchanged = 0
    for finding in after["findings"]:
        same = waiting.get(_key(finding, place_after, roles_after, renumbered))
        if not same:
            new.append(finding)
            continue
        was = next((one for one in same if one["fingerprint"] == finding["fingerprint"]), same[0])
        same.remove(was)
        if LEVELS.index(finding["level"]) < LEVELS.index(was["level"]):
            risen.append({**finding, "level_before": was["level"]})
        else:
            unchanged += 1
    gone = [finding for left in waiting.values() for finding in left]
    return {"new": new, "risen": risen, "gone": gone, "unchanged": unchanged}


def _roles(report: Report) -> dict[tuple[str, str], str]:
    return {(limiter["id"], part["id"]): part["role"] for limiter in report["limiters"] for part in limiter["parts"]}


def _key(
    finding: Report, places: Mapping[str, int], roles: Mapping[tuple[str, str], str], renumbered: bool
) -> tuple[Any, ...]:
    """Return what a finding is about, apart from names: its check, its limiter's pair, the roles of its parts.

    A finding about no paired limiter goes by its fingerprint, or where designators were renumbered by its parts' types.
    """
    limiter = finding["limiter"]
    if limiter in places:
        return finding["check"], places[limiter], tuple(sorted(roles.get((limiter, part), "") for part in finding["parts"]))
    if not renumbered:
        return finding["check"], None, finding["fingerprint"]
    return finding["check"], None, tuple(sorted(str(type_of(place)) for place in finding["places"]))
