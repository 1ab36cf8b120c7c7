"""TOML files as sources: places of keys, and one clear error for whatever is no TOML."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.sources import InputError
from protlint.toml.file import LARGEST_TOML, load_toml
from protlint.toml.places import key_places
from protlint.toml.tables import Table


def test_a_key_has_its_line_and_column_and_an_unknown_one_that_of_its_holder(tmp_path: Path) -> None:
    path = tmp_path / "some.toml"
    path.write_text("# first\n[a]\nb = [ 1,\n  { c = 2 } ]\n", encoding="utf-8")
    document = load_toml(path)
    assert document.tables == {"a": {"b": [1, {"c": 2}]}}
    assert document.place(("a",)) == (2, 2)
    assert document.place(("a", "b")) == (3, 1)
    assert document.place(("a", "b", 1, "c")) == (4, 5)
    assert document.place(("a", "b", 1, "none")) == (4, 3)
    assert document.place(("none",)) == (1, 1)


def test_a_file_of_megabytes_is_refused_before_it_is_parsed(tmp_path: Path) -> None:
    path = tmp_path / "big.toml"
    path.write_bytes(b"#" * (LARGEST_TOML + 1))
    with pytest.raises(InputError, match="MB"):
        load_toml(path)


@pytest.mark.parametrize(
    "content", [b"a = 2027-02-31\n", b"a = " + b"9" * 5000 + b"\n", b"a = '\x00'\n", b"\xff\xfe[\x00a\x00]\x00"]
)
def test_odd_content_is_one_clear_error(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "odd.toml"
    path.write_bytes(content)
    with pytest.raises(InputError) as caught:
        load_toml(path)
    assert "\n" not in str(caught.value)


def test_a_table_that_stands_twice_is_named_as_people_write_it(tmp_path: Path) -> None:
    path = tmp_path / "twice.toml"
    path.write_text("[a.b]\n[a.b]\n", encoding="utf-8")
    with pytest.raises(InputError, match=r"^twice\.toml:2:\d+: not TOML: Cannot declare a\.b twice$"):
        load_toml(path)


@given(content=st.binary(max_size=60) | st.text(alphabet="[]{}=\"'#.,\n ab1", max_size=40).map(lambda text: text.encode()))
def test_any_bytes_are_tables_or_one_clear_error(tmp_path_factory: pytest.TempPathFactory, content: bytes) -> None:
    path = tmp_path_factory.mktemp("toml") / "any.toml"
    path.write_bytes(content)
    try:
        document = load_toml(path)
    except InputError as error:
        assert "\n" not in str(error)
    else:
        assert all((name,) in key_places(document.text) for name in document.tables)


def test_a_hostile_text_in_an_error_stays_one_printable_line(tmp_path: Path) -> None:
    path = tmp_path / "hostile.toml"
    path.write_text('"a\\u001b[31m\\nb" = 1\n')
    with pytest.raises(InputError) as caught:
        Table.whole(load_toml(path)).only(("board",))
    assert str(caught.value).isprintable()
