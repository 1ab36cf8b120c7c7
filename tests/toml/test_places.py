"""Where the keys of a TOML document stand, against the standard library's reader."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path
from typing import Any

from hypothesis import given
from hypothesis import strategies as st

from protlint.toml.places import key_places
from tests.support.paths import ROOT

KEYS = st.one_of(
    st.text(alphabet="abcXYZ019_-", min_size=1, max_size=4),
    st.text(alphabet='a.b "#=[]{}\\éΩ\n\t', max_size=4),
    st.sampled_from(["+24V", "U1.6", "*", "Q1?", "0", "true"]),
)
SCALARS = st.one_of(
    st.integers(-1000, 1000),
    st.booleans(),
    st.floats(allow_nan=False, allow_infinity=False),
    st.text(alphabet="ab#\"\\[]{},=\n\r\t'é", max_size=8),
)
TREES = st.recursive(
    SCALARS, lambda inner: st.lists(inner, max_size=3) | st.dictionaries(KEYS, inner, max_size=3), max_leaves=12
)


def _key(name: str, quoted: bool) -> str:
    bare = name and all(letter.isascii() and (letter.isalnum() or letter in "_-") for letter in name)
    return name if bare and not quoted else json.dumps(name)


def _inline(value: Any, draw: st.DataObject) -> str:
    if isinstance(value, dict):
        pairs = (f"{_key(name, draw.draw(st.booleans()))} = {_inline(item, draw)}" for name, item in value.items())
        return "{ " + ", ".join(pairs) + " }"
    if isinstance(value, list):
        gap = draw.draw(st.sampled_from([" ", "\n  ", " # no ] yet\n"]))
        return "[" + "".join(f"{gap}{_inline(item, draw)}," for item in value) + gap + "]"
    if isinstance(value, str) and "'" not in value and value.isprintable() and draw.draw(st.booleans()):
        return f"'{value}'"
    if isinstance(value, str) and draw.draw(st.booleans()):
        return '"""' + json.dumps(value)[1:-1] + '"""'
    return json.dumps(value)


def _document(tree: dict[str, Any], draw: st.DataObject, path: tuple[str, ...] = ()) -> str:
    """Write a tree as tables, arrays of tables and inline values, as chance has it."""
    own, below = [], []
    for name, value in tree.items():
        header = ".".join(_key(part, draw.draw(st.booleans())) for part in (*path, name))
        if isinstance(value, dict) and draw.draw(st.booleans()):
            below.append(f"[{header}] # a table\n" + _document(value, draw, (*path, name)))
        elif isinstance(value, list) and value and all(isinstance(row, dict) for row in value) and draw.draw(st.booleans()):
            below += [f"[[ {header} ]]\n" + _document(row, draw, (*path, name)) for row in value]
        else:
            own.append(f"  {_key(name, draw.draw(st.booleans()))} = {_inline(value, draw)}\n")
    return "".join(own) + "\n" + "".join(below)


def _paths(value: Any, path: tuple[str | int, ...] = ()) -> set[tuple[str | int, ...]]:
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    return {path} | {found for key, item in items for found in _paths(item, (*path, key))}


@given(tree=st.dictionaries(KEYS, TREES, max_size=4), draw=st.data())
def test_every_key_has_a_place_and_stands_there(tree: dict[str, Any], draw: st.DataObject) -> None:
    text = _document(tree, draw)
    parsed = tomllib.loads(text)
    places = key_places(text)
    assert set(places) == _paths(parsed) - {()}
    for path, offset in places.items():
        last = path[-1]
        if isinstance(last, str):
            assert text.startswith((last, json.dumps(last)), offset)


def test_dotted_keys_and_tables_inside_arrays() -> None:
    text = 'a.b."c.d" = 1\n[[t]]\nx.y = 2\n[t.u]\nz = 3\n[[t]]\nx = { y = [1, { w = 2 }] }\n'
    places = {path: text.count("\n", 0, offset) + 1 for path, offset in key_places(text).items()}
    assert set(places) == _paths(tomllib.loads(text)) - {()}
    assert places["a", "b", "c.d"] == 1
    assert places["t", 0, "x", "y"] == 3
    assert places["t", 0, "u", "z"] == 5
    assert places["t", 1, "x", "y", 1, "w"] == 7


def test_every_toml_file_of_the_repository() -> None:
    files = [path for path in Path(ROOT).rglob("*.toml") if "invalid" not in path.parts and ".venv" not in path.parts]
    assert len(files) >= 6
    for path in files:
        text = path.read_text(encoding="utf-8")
        assert set(key_places(text)) == _paths(tomllib.loads(text)) - {()}, path.name
