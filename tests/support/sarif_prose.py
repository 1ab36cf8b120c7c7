"""What the SARIF 2.1.0 standard (OASIS, errata 01) asks in its prose and its schema cannot hold.

Section numbers and rules are from memory of the standard, but for those that its schema states as well.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

Node = dict[str, Any]

RELATIVE = re.compile(r"(?:[A-Za-z0-9._~!$&'()*+,;=@/-]|%[0-9A-F]{2})+")
"""A relative reference of RFC 3986 whose first step holds no colon, normalised: upper-case codes."""

SEMANTIC = re.compile(r"\d+\.\d+\.\d+(?:-[0-9A-Za-z.-]+)?(?:\+[0-9A-Za-z.-]+)?")
PLACEHOLDER = re.compile(r"(?<!\{)(?:\{\{)*\{(\d+)\}(?!\})")
LINK = re.compile(r"(?<!\\)\[[^\]]*\]\(([^)]*)\)")


def prose_errors(log: Node) -> list[str]:
    """Return what a log does otherwise than the prose asks, each with its section."""
    return [error for run in log["runs"] for rule in RULES for error in rule(run)]


def _rules(run: Node) -> Iterator[str]:
    driver = run["tool"]["driver"]
    names = [rule["id"] for rule in driver["rules"]]
    if len(set(names)) != len(names):
        yield "3.19.23: rule ids repeat"
    if not SEMANTIC.fullmatch(driver["semanticVersion"]):
        yield "3.19.12: no semantic version"
    for rule in driver["rules"]:
        if rule.get("name") == rule["id"]:
            yield "3.49.7: a name that repeats the id"
        for key in ("shortDescription", "fullDescription"):
            if key in rule and not rule[key]["text"].endswith("."):
                yield "3.49.9: a description is a sentence"


def _artifacts(run: Node) -> Iterator[str]:
    artifacts = run["artifacts"]
    uris = [artifact["location"]["uri"] for artifact in artifacts]
    if len(set(uris)) != len(uris):
        yield "3.14.15: artifacts repeat"
    for artifact in artifacts:
        if not re.fullmatch("[0-9a-f]{64}", artifact["hashes"].get("sha-256", "")):
            yield "3.24.11: a hash goes by its name in lower case and is hexadecimal"
    for where in _all(run, "artifactLocation"):
        if where["index"] not in range(len(uris)) or uris[where["index"]] != where["uri"]:
            yield "3.4.5: artifact and index differ"
    for uri in uris:
        if not RELATIVE.fullmatch(uri) or uri.startswith("/") or ".." in uri.split("/"):
            yield "3.4.3: no normalised relative reference"
    for where in (*_all(run, "artifactLocation"), *(artifact["location"] for artifact in artifacts)):
        if "uriBaseId" in where and where["uriBaseId"] not in run.get("originalUriBaseIds", {}):
            yield "3.4.4: a base that is not given"


def _invocations(run: Node) -> Iterator[str]:
    names = [rule["id"] for rule in run["tool"]["driver"]["rules"]]
    for invocation in run["invocations"]:
        told = [one for kind in ("Execution", "Configuration") for one in invocation[f"tool{kind}Notifications"]]
        for notification in told:
            rule = notification.get("associatedRule")
            if rule is not None and (rule["index"] not in range(len(names)) or names[rule["index"]] != rule["id"]):
                yield "3.52.5: associated rule and index differ"
        if any(one["level"] == "error" for one in told) and invocation["executionSuccessful"]:
            yield "3.20.14: a run with an error of its own was successful"


def _results(run: Node) -> Iterator[str]:
    if not isinstance(run.get("results"), list):
        yield "3.14.23: a run that looked for results has the array"
        return
    names = [rule["id"] for rule in run["tool"]["driver"]["rules"]]
    if len({"suppressions" in result for result in run["results"]}) > 1:
        yield "3.27.23: suppressions on some results only"
    seen = set()
    for result in run["results"]:
        if result["ruleIndex"] not in range(len(names)) or names[result["ruleIndex"]] != result["ruleId"]:
            yield "3.27.6: rule id and index differ"
        if (result.get("kind", "fail") == "fail") == (result["level"] == "none"):
            yield "3.27.10: a level belongs to a result of kind fail, and to no other"
        identities = [location["id"] for location in result["relatedLocations"]]
        if len(set(identities)) != len(identities) or min(identities, default=1) < 0:
            yield "3.28.2: location ids repeat"
        if any("message" not in location for location in result["relatedLocations"]):
            yield "3.27.22: a related location says what it is"
        for key, value in result["partialFingerprints"].items():
            if not re.fullmatch(r"[^/]+(/[^/]+)*/v\d+", key) or not value:
                yield "3.27.17: a fingerprint has a versioned key and a value"
        where = result["locations"][0]["physicalLocation"]["artifactLocation"]["uri"]
        identity = (where, *sorted(result["partialFingerprints"].items()))
        if identity in seen:
            yield "3.27.17: fingerprints repeat"
        seen.add(identity)
        for suppression in result.get("suppressions", ()):
            if suppression.get("status") == "accepted" and not suppression.get("justification"):
                yield "3.35.4: a suppression that was accepted says why"
            if suppression["kind"] == "external" and "location" in suppression:
                yield "3.35.5: a suppression outside the source has no location in it"


def _places(run: Node) -> Iterator[str]:
    for region in _all(run, "region"):
        start, end = (
            (region.get("startLine", 0), region.get("startColumn", 1)),
            region.get("endLine", region.get("startLine")),
        )
        if start[0] < 1 or start[1] < 1:
            yield "3.30.5: lines and columns count from 1"
        if end is not None and (end, region.get("endColumn", start[1])) < start:
            yield "3.30.7: a region ends before it begins"
        if "startColumn" in region and run.get("columnKind") not in ("utf16CodeUnits", "unicodeCodePoints"):
            yield "3.14.17: what columns count is not said"
    for places in _all(run, "logicalLocations"):
        for place in places:
            if not place["fullyQualifiedName"].endswith(place["name"]) or not place["name"]:
                yield "3.33.5: a name is the end of the qualified name"


def _messages(run: Node) -> Iterator[str]:
    related = {id(one["message"]): {place["id"] for place in one["relatedLocations"]} for one in run["results"] or ()}
    for message in _all(run, "message"):
        for number in PLACEHOLDER.findall(message["text"]):
            if int(number) >= len(message.get("arguments", ())):
                yield "3.11.5: a placeholder without an argument"
        for target in LINK.findall(message["text"]):
            if target.isdecimal() and int(target) not in related.get(id(message), set()):
                yield "3.11.6: a link to no location"
    sentences = [result["message"] for result in run["results"] or ()]
    sentences += [one["message"] for call in run["invocations"] for one in call["toolExecutionNotifications"]]
    if any(not message["text"].endswith(".") for message in sentences):
        yield "3.11.3: a message is a sentence"


RULES = (_rules, _artifacts, _invocations, _results, _places, _messages)


def _all(node: Any, name: str) -> Iterator[Any]:
    """Yield whatever stands under a key anywhere below; property bags are the writer's own."""
    if isinstance(node, dict):
        for key, value in node.items():
            if key == name:
                yield value
            if key != "properties":
                yield from _all(value, name)
    elif isinstance(node, list):
        for value in node:
            yield from _all(value, name)
