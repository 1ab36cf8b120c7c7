"""Text from a netlist made harmless: each face escapes every string of the document once, at its door.

A name on a board can hold terminal escapes, line ends, marks that turn the reading direction, markup, and lines that
continuous-integration systems take for commands. Whatever it holds is shown, and nothing of it acts.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Callable
from typing import Any

ACTING_CATEGORIES = frozenset({"Cc", "Cf", "Cs", "Zl", "Zp"})
"""Unicode categories of characters that steer a display instead of standing on it."""

SUSPECT = re.compile(r"[^ -~]|::|##")
"""What printable ASCII text does not hold, and how lines that continuous-integration systems act on begin."""

MARKDOWN_ACTING = re.compile(r"[\\`*_\[\]<>|~$&#{}!]")
MARKDOWN_LEADING = re.compile(r"^([-+=:]|\d+[.)](?=\s|$))")
MARKDOWN_LINKED = re.compile(r"(?i)[@#!%~&$](?=\w)|:(?=[a-z][\w+-]*:)|\b(https?|ftp|mailto)(?=:)|\bwww(?=\.)")
"""What trackers turn into links by themselves: mentions, references, addresses; an empty comment keeps them text."""

LONG_NAME = re.compile(r"[^\s,;:()]{161,}")
LONG_TEXT = 4_000
"""What nobody reads to its end: a name, and a whole text."""

XML_BREAK = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


def throughout(value: Any, escape: Callable[[str], str]) -> Any:
    """Return a document with every string in it escaped; keys are ours and stay."""
    if isinstance(value, str):
        return escape(value)
    if isinstance(value, dict):
        return {key: throughout(item, escape) for key, item in value.items()}
    if isinstance(value, list):
        return [throughout(item, escape) for item in value]
    return value


def terminal(text: str) -> str:
    r"""Return text fit for a terminal and a log: acting characters as ``\x1b``, ``\u202e``, command marks broken."""
    return SUSPECT.sub(_escaped_for_terminal, text)


def brief(text: str) -> str:
    """Return a text; of one longer than :data:`LONG_TEXT` its two ends, and how much lies between."""
    return text if len(text) <= LONG_TEXT else f"{text[:1000]} ..({len(text) - 1300} more).. {text[-300:]}"


def readable(text: str) -> str:
    """Return text fit for a terminal; of the longest names and texts their two ends, and how much lies between."""
    text = LONG_NAME.sub(lambda match: f"{match[0][:100]}..({len(match[0]) - 130} more)..{match[0][-30:]}", terminal(text))
    return brief(text)


def xml(text: str) -> str:
    """Return text fit for XML 1.0 and whoever shows it; markup is the XML writer's to escape."""
    return XML_BREAK.sub(lambda match: _code(match.group()), terminal(text))


def markdown(text: str) -> str:
    """Return text that stands in Markdown as itself: no markup, no mention, no link, no table cell, no math."""
    escaped = MARKDOWN_ACTING.sub(lambda match: "\\" + match.group(), readable(text))
    escaped = MARKDOWN_LEADING.sub(lambda match: match.group()[:-1] + "\\" + match.group()[-1], escaped)
    return MARKDOWN_LINKED.sub(lambda match: match.group() + "<!-- -->", escaped)


def json_text(text: str) -> str:
    r"""Return JSON text whose strings, shown raw or put into a page, do not act: the same data, escaped as JSON allows."""
    return re.sub(r"[^\n -~]|</|(?<=#)#", _escaped_for_json, text)


def _escaped_for_terminal(match: re.Match[str]) -> str:
    found = match.group()
    if len(found) == 2:
        return found[0] + _code(found[1])
    return _code(found) if unicodedata.category(found) in ACTING_CATEGORIES else found


def _escaped_for_json(match: re.Match[str]) -> str:
    found = match.group()
    if found == "</":
        return "<\\/"
    if found == "#":
        return "\\u0023"
    if unicodedata.category(found) not in ACTING_CATEGORIES:
        return found
    code = ord(found)
    if code > 0xFFFF:
        high, low = divmod(code - 0x10000, 0x400)
        return f"\\u{0xD800 + high:04x}\\u{0xDC00 + low:04x}"
    return f"\\u{code:04x}"


def _code(character: str) -> str:
    code = ord(character)
    if code < 0x100:
        return f"\\x{code:02x}"
    return f"\\u{code:04x}" if code < 0x10000 else f"\\U{code:08x}"
