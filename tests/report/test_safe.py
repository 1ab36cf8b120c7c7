"""Text from a netlist stands in every face as itself and does not act."""

from __future__ import annotations

import json
import re
from xml.etree import ElementTree

import pytest
from hypothesis import given
from hypothesis import strategies as st

from protlint.report.safe import json_text, markdown, readable, terminal, throughout, xml
from tests.support.sample_review import HOSTILE

ANY_TEXT = st.text(alphabet=st.characters(), max_size=40) | st.sampled_from(HOSTILE)


@given(ANY_TEXT)
def test_nothing_steers_a_terminal_or_a_log(text: str) -> None:
    shown = terminal(text)
    assert not re.search("[\x00-\x1f\x7f-\x9f\u200b-\u200f\u2028-\u202e\u2066-\u2069\ud800-\udfff]", shown)
    assert "::" not in shown
    assert "##" not in shown


@given(st.text(alphabet=st.characters(min_codepoint=0x20, max_codepoint=0x7E, exclude_characters=":#"), max_size=40))
def test_ordinary_text_stays_as_it_is(text: str) -> None:
    assert terminal(text) == text == xml(text)


@given(ANY_TEXT, st.integers(1, 3))
def test_the_longest_names_show_their_ends(text: str, times: int) -> None:
    name = "Q" + "n" * 1998 + "7"
    shown = readable(f"{name} of {text}, {name}: " * times)
    assert shown.count("..(1870 more)..") == 2 * times
    assert max(map(len, re.split(r"[\s,;:()]", shown))) <= 160
    assert readable("n" * 160) == "n" * 160


def test_the_longest_texts_show_their_ends() -> None:
    text = "begins " + "and goes on " * 1000 + "and ends"
    shown = readable(text)
    assert shown.startswith("begins and")
    assert shown.endswith("and ends")
    assert f"({len(text) - 1300} more)" in shown
    assert len(shown) < 1400
    assert readable(text[:4000]) == text[:4000]


@given(ANY_TEXT)
def test_xml_takes_it(text: str) -> None:
    element = ElementTree.Element("a", b=xml(text))
    element.text = xml(text)
    again = ElementTree.fromstring(ElementTree.tostring(element, encoding="unicode"))
    assert (again.text or "") == xml(text)
    assert again.get("b") == xml(text)


@given(ANY_TEXT)
def test_markdown_has_no_markup_of_its_own_left(text: str) -> None:
    shown = markdown(text).replace("<!-- -->", "")
    bare = re.sub(r"\\.", "", shown)
    assert not re.search(r"[`*_\[\]<>|~$&#{}!\\]", bare)
    assert "\n" not in shown


@pytest.mark.parametrize(
    ("text", "acting"),
    [
        ("@everyone", r"@\w"),
        ("see #12", r"#\d"),
        ("!12", r"!\d"),
        ("http://example.invalid", "http:"),
        ("www.example.invalid", r"www\."),
        (":smile:", r":smile:"),
    ],
)
def test_what_trackers_link_by_themselves_is_broken_up(text: str, acting: str) -> None:
    assert not re.search(acting, markdown(text))


@given(st.recursive(ANY_TEXT | st.none() | st.booleans() | st.integers(), lambda inner: st.lists(inner, max_size=3)))
def test_escaped_json_is_the_same_data(value: object) -> None:
    text = json_text(json.dumps(value, ensure_ascii=False))
    assert json.loads(text) == value
    assert "</" not in text
    assert "##" not in text
    text.encode("utf-8")


def test_every_string_of_a_document_is_reached() -> None:
    document = {"a": "x", "b": ["x", {"c": "x", "d": 1.0, "e": None}], "f": True}
    assert throughout(document, lambda text: text + "!") == {
        "a": "x!",
        "b": ["x!", {"c": "x!", "d": 1.0, "e": None}],
        "f": True,
    }
