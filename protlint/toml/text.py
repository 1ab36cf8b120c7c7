"""Writing TOML: any text as a string or a key that reads back the same."""

from __future__ import annotations

import re

_ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\r": "\\r", "\t": "\\t"}
_ESCAPED = re.compile('["\\\\\x00-\x1f\x7f-\x9f\u200b-\u200f\u2028-\u202e\u2060-\u2069\ufeff]|(?<=#)#|(?<=:):')
_SURROGATE = re.compile("[\ud800-\udfff]")
_BARE = re.compile(r"[A-Za-z0-9_-]+")


def toml_string(text: str) -> str:
    """Return a text as a basic string of TOML 1.0; what steers a display or a build's log is written as an escape.

    A lone surrogate, which TOML cannot hold, becomes a question mark.
    """
    return '"' + _ESCAPED.sub(_escaped, _SURROGATE.sub("?", text)) + '"'


def toml_key(text: str) -> str:
    """Return a text as a key: bare where TOML allows it, else quoted."""
    return text if _BARE.fullmatch(text) else toml_string(text)


def _escaped(found: re.Match[str]) -> str:
    character = found.group()
    return _ESCAPES.get(character, f"\\u{ord(character):04x}")
