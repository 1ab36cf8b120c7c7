"""The report as SARIF 2.1.0 (OASIS), for code hosts and dashboards: one run, a result per finding.

What has no place in a netlist (what was not checked, reading warnings, files that could not be read) becomes a notification
of the invocation. Section numbers name the prose rules of the standard that its schema cannot hold.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterable, Mapping
from urllib.parse import quote

from protlint import __version__
from protlint.checks.catalogue import CheckRow, load_catalogue
from protlint.report.digest import left_open, place_of, sentence, times, unsolved, waiver_of
from protlint.report.figures import figure
from protlint.report.memory import resting
from protlint.report.safe import json_text, terminal, throughout
from protlint.report.shape import CAUTION, Document, boards_of

SCHEMA = "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"

FINGERPRINT_KEY = "protlint/v1"

_LINK = re.compile(r"\[(?=[^\]]*\]\()")


def rendered_sarif(report: Document) -> str:
    """Return the report as a SARIF log."""
    boards = boards_of(report)
    uris = [artifact_uri(board["netlist"]["file"]) for board in boards]
    unique = list(dict.fromkeys(uris))
    safe: Document = throughout(report, terminal)
    catalogue = load_catalogue()
    rules = _rules(catalogue, (finding["check"] for board in boards_of(safe) for finding in board["findings"]))
    index_of = {rule["id"]: place for place, rule in enumerate(rules)}
    results: list[Document] = []
    notifications: list[Document] = []
    for place, board in enumerate(boards_of(safe)):
        artifact = {"uri": uris[place], "index": unique.index(uris[place])}
        results += (_result(finding, board, artifact, index_of) for finding in board["findings"])
        notifications += _notifications(board, artifact, index_of)
    remarks = [text for board in boards_of(safe) for text in board["remarks"]] + (
        safe["remarks"] if "boards" in safe else []
    )
    unread = safe.get("unread", [])
    notifications += (_told("error", f"{place_of(error)}: {error['message']}") for error in unread)
    run = {
        "tool": {
            "driver": {
                "name": "protlint",
                "version": __version__,
                "semanticVersion": __version__,
                "shortDescription": {"text": "Reviews the protective current limiters on a board."},
                "fullDescription": {"text": CAUTION},
                "rules": rules,
            }
        },
        "invocations": [
            {
                "executionSuccessful": not unread,
                "toolExecutionNotifications": notifications,
                "toolConfigurationNotifications": [_told("warning", text) for text in remarks],
            }
        ],
        "artifacts": [
            {
                "location": {"uri": uri},
                "roles": ["analysisTarget"],
                "hashes": {"sha-256": boards[uris.index(uri)]["netlist"]["sha256"]},
            }
            for uri in unique
        ],
        "columnKind": "unicodeCodePoints",
        "results": results,
    }
    log = {"$schema": SCHEMA, "version": "2.1.0", "runs": [run]}
    return json_text(json.dumps(log, ensure_ascii=False, indent=2, allow_nan=False)) + "\n"


def artifact_uri(file: str) -> str:
    """Return a file's name as a relative URI reference (RFC 3986); bytes that are no UTF-8 stand as they are."""
    try:
        name = file.encode("utf-8", "surrogateescape")
    except UnicodeEncodeError:
        name = file.encode("utf-8", "surrogatepass")
    return quote(name, safe="/")


def message(text: str) -> Document:
    """Return a plain-text message: braces doubled (3.11.5), brackets that would make a link escaped (3.11.6)."""
    doubled = text.replace("{", "{{").replace("}", "}}")
    return {"text": _LINK.sub(r"\\[", doubled)}


def _rules(catalogue: Mapping[str, CheckRow], used: Iterable[str]) -> list[Document]:
    """Describe every check of the catalogue, and by name alone those that a user's own rules added."""
    rules = []
    for row in catalogue.values():
        limits = [_sentence(f"{limit.says}: {figure(limit.value, limit.unit)}") for limit in row.thresholds.values()]
        rules.append(
            {
                "id": row.name,
                "shortDescription": {"text": _sentence(row.says)},
                "fullDescription": {"text": _sentence(row.why)},
                "help": {
                    "text": "\n".join([_sentence(row.why), f"Formula: {row.formula}.", *limits, f"Source: {row.source}."])
                },
                "defaultConfiguration": {"level": row.level},
            }
        )
    return rules + [{"id": name} for name in dict.fromkeys(used) if name not in catalogue]


def _sentence(text: str) -> str:
    return text[:1].upper() + _ended(text[1:])


def _ended(text: str) -> str:
    """Return a text with a full stop, as messages are to have (3.11.3)."""
    return text.rstrip(".") + "."


def _result(finding: Document, board: Document, artifact: Document, index_of: Mapping[str, int]) -> Document:
    remedy = f" Remedy: {finding['remedy']}." if finding["remedy"] else ""
    place = {"line": finding["line"], "column": finding["column"]}
    others = [one for one in finding["places"] if (one["line"], one["column"]) != (finding["line"], finding["column"])]
    return {
        "ruleId": finding["check"],
        "ruleIndex": index_of[finding["check"]],
        "level": finding["level"],
        "message": message(_ended(sentence(finding)) + remedy),
        "locations": [{"physicalLocation": _physical(artifact, place), "logicalLocations": _logical(finding, board)}],
        "relatedLocations": [
            {"id": number, "physicalLocation": _physical(artifact, one), "message": message(one["part"])}
            for number, one in enumerate(others, 1)
        ],
        "partialFingerprints": {FINGERPRINT_KEY: finding["fingerprint"]},
        "suppressions": _suppressions(finding),
        "properties": {
            key: finding[key] for key in ("limiter", "parts", "nets", "assumption", "remedy", "working", "fingerprint")
        },
    }


def _physical(artifact: Document, place: Document) -> Document:
    region = {"startLine": place["line"]} if place["line"] is not None else {}
    if region and place["column"] is not None:
        region["startColumn"] = place["column"]
    return {"artifactLocation": artifact, "region": region} if region else {"artifactLocation": artifact}


def _logical(finding: Document, board: Document) -> list[Document]:
    """Name the limiter and the parts by the last step of their way, and qualified by the design (3.33)."""
    design = board["netlist"]["design"]
    named = [(finding["limiter"], "limiter")] if finding["limiter"] else []
    named += [(part, "part") for part in dict.fromkeys(finding["parts"])]
    return [
        {"name": name.rpartition("/")[2] or name, "fullyQualifiedName": f"{design}/{name}", "kind": kind}
        for name, kind in named
    ]


def _suppressions(finding: Document) -> list[Document]:
    """Return the waiver as a suppression; every result has the array, empty where it is not suppressed (3.27.23)."""
    if finding["waived"] is None:
        return []
    return [{"kind": "external", "status": "accepted", "justification": waiver_of(finding)}]


def _notifications(board: Document, artifact: Document, index_of: Mapping[str, int]) -> list[Document]:
    notifications = []
    for warning in board["warnings"]:
        location = {"physicalLocation": _physical(artifact, warning)}
        notifications.append({**_told("warning", warning["message"] + times(warning["count"])), "locations": [location]})
    notifications += (_unchecked(None, row, index_of) for row in board["not_checked"])
    for limiter in board["limiters"]:
        notifications += (_unchecked(limiter["id"], row, index_of) for row in left_open(limiter))
        if limiter["not_solved"]:
            notifications.append(_told("warning", f"{limiter['id']} was not solved{unsolved(limiter)}"))
        notifications += (
            _told("note", f"{limiter['id']} rests on figures from memory: {text}") for text in resting(limiter)
        )
    notifications += (_told("note", f"Assumed: {text}") for text in board["assumed"])
    return notifications


def _told(level: str, text: str) -> Document:
    return {"level": level, "message": message(_ended(text))}


def _unchecked(limiter: str | None, row: Document, index_of: Mapping[str, int]) -> Document:
    whom = f"{limiter}: " if limiter is not None else ""
    known = {"associatedRule": {"id": row["check"], "index": index_of[row["check"]]}} if row["check"] in index_of else {}
    return {**_told("note", f"{whom}{row['check']} was not checked; it needs {row['needs']}"), **known}
