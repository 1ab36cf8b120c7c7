from __future__ import annotations

import gc

import pytest
import sexpdata
from hypothesis import given, settings
from hypothesis import strategies as st

from protlint.netlist.forms import NESTING_LIMIT, Atom, Form, FormParser, Places, no_collection, read_forms
from protlint.sources import InputError
from tests.support.paths import FIXTURES

STEADY = settings(deadline=None, derandomize=True)


class Symbols(FormParser):
    """Words as sexpdata gives them when it turns none into anything else."""

    def atom(self, token: str) -> sexpdata.Symbol:
        return sexpdata.Symbol(token)


class Plain(sexpdata.Parser):  # type: ignore[misc]
    """sexpdata's own scanner, told not to turn words into numbers, truth values or empty lists."""

    def atom(self, token: str) -> sexpdata.Symbol:
        return sexpdata.Symbol(token)


def sexpdata_tree(text: str) -> object:
    return Plain(text, nil=None, true=None, line_comment="\0").parse()


def tree(text: str) -> object:
    return Symbols(text).parse()


@pytest.mark.parametrize("name", ["flat-instances", "hierarchy-instances", "case", "no-design", "designs"])
def test_the_tree_of_sexpdata_on_fixtures(name: str) -> None:
    text = (FIXTURES / "netlist" / "valid" / f"{name}.edf").read_text(encoding="utf-8")
    assert tree(text) == sexpdata_tree(text)


def test_the_tree_of_sexpdata_loads_where_no_word_is_special() -> None:
    text = (FIXTURES / "netlist" / "valid" / "flat-instances.edf").read_text(encoding="utf-8")
    plain = text.replace("2 0 0", "two zero zero").replace("Level 0", "Level none").replace("2026 2 3 10 0 0", "then")
    plain = plain.replace("'", "")
    assert [sexpdata.loads(plain)] == tree(plain)


def test_the_tree_of_sexpdata_with_strings_escaped_for_it() -> None:
    text = (FIXTURES / "netlist" / "valid" / "strings.edf").read_text(encoding="utf-8").replace("%", "")
    escaped = text.replace("\\", "\\\\")
    assert tree(text) == sexpdata_tree(escaped)


WORDS = st.text("abcXYZ_&019-+.[]';", min_size=1, max_size=6)
STRINGS = st.text("ab \t()[];'_0", max_size=8)
TREES = st.recursive(WORDS.map(Atom) | STRINGS, lambda inner: st.lists(inner, max_size=5).map(Form), max_leaves=30).filter(
    lambda item: isinstance(item, Form)
)


def written(item: object, blank: str) -> str:
    if isinstance(item, Form):
        return "(" + blank + blank.join(written(each, blank) for each in item) + blank + ")"
    return str(item) if isinstance(item, Atom) else f'"{item}"'


@STEADY
@given(TREES, st.sampled_from([" ", "\n", "\t", "\r\n", " \f\v "]))
def test_what_is_written_is_read(item: Form, blank: str) -> None:
    text = written(item, blank) + blank
    assert FormParser(text).parse() == [item]
    assert kinds(Symbols(text).parse()) == kinds([item])


def kinds(item: object) -> object:
    """What is a word, a string, a list."""
    if isinstance(item, list):
        return [kinds(each) for each in item]
    return "word" if isinstance(item, Atom | sexpdata.Symbol) else "string"


@pytest.mark.parametrize("blank", ["", " ", "\r\n\t"])
@pytest.mark.parametrize("strings", [(), ("",), ("s (t)",), ("50 % 2%",), ("s", "t")])
@pytest.mark.parametrize("words", range(6))
def test_lists_of_every_shape_close_on_each_other(words: int, strings: tuple[str, ...], blank: str) -> None:
    items = [Atom(word) for word in "abcdef"[:words]] + list(strings)
    inner = (
        "(" + blank + (" " + blank).join(map(str, items[:words])) + blank.join(f'"{each}"' for each in strings) + blank + ")"
    )
    text = f"(x{blank}{inner}{inner}{blank}(y{blank}{inner}){blank}z)"
    [form] = read_forms(text, "shapes")
    assert form == ["x", items, items, ["y", items], "z"]
    assert kinds(form) == kinds([Atom("x"), items, items, [Atom("y"), items], Atom("z")])
    first = len("(x" + blank)
    assert (form[1].offset, form[2].offset) == (first, first + len(inner))
    if strings:
        cut = text[: text.rindex('"')]
        with pytest.raises(InputError, match="this string is never closed") as caught:
            read_forms(cut, "shapes")
        assert (caught.value.line, caught.value.column) == Places(cut).at(cut.rindex('"'))


def test_words_stay_words() -> None:
    [form] = FormParser("(net INF nan t nil 1_000 1e5 0x10 -3 'a ;b [c])").parse()
    assert list(form) == ["net", "INF", "nan", "t", "nil", "1_000", "1e5", "0x10", "-3", "'a", ";b", "[c]"]
    assert all(type(item) is str for item in form)


def test_the_contract_of_the_parser_it_subclasses() -> None:
    parser = FormParser('(a "b") c "d" ()')
    assert isinstance(parser, sexpdata.Parser)
    assert parser.string == '(a "b") c "d" ()'
    assert parser.parse() == [["a", "b"], "c", "d", []]


def test_strings() -> None:
    text = (
        '("R\\E\\S\\E\\T\\" "a\nb\r\nc\rd" "%34%x%34%" "%13 10%" "0,5%" "1% 5%" "%0% %55296% %1114112%"'
        ' "%99999999999%" "%37%")'
    )
    parser = FormParser(text)
    [form] = parser.parse()
    assert list(form) == [
        "R\\E\\S\\E\\T\\", "abcd", '"x"', "\r\n", "0,5%", "1% 5%", "%0% %55296% %1114112%", "%99999999999%", "%",
    ]  # fmt: skip
    assert [kept for _, kept in parser.unpaired] == ["0,5%", "1% 5%", "%0% %55296% %1114112%", "%99999999999%"]


@STEADY
@given(st.text(st.characters(codec="ascii", categories=["L", "N", "P", "S", "Zs"], exclude_characters='"%')), st.data())
def test_a_string_wrapped_anywhere_reads_as_unwrapped(text: str, data: st.DataObject) -> None:
    cuts = data.draw(st.lists(st.integers(0, len(text)), max_size=4).map(sorted))
    wrapped = text
    for cut in reversed(cuts):
        wrapped = wrapped[:cut] + data.draw(st.sampled_from(["\n", "\r\n"])) + wrapped[cut:]
    assert FormParser(f'(s "{wrapped}")').parse() == [["s", text]]


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_lines_and_columns(end: str) -> None:
    text = end.join(["", "  (a (b", '     "x', 'y" (c))', "", "   d)"])
    [form] = FormParser(text).parse()
    assert (form.line, form.column) == (2, 3)
    assert (form[1].line, form[1].column) == (2, 6)
    assert (form[1][2].line, form[1][2].column) == (4, 4)
    places = Places(text)
    assert places.at(len(text) - 1) == (6, 5)
    assert places.at(0) == (1, 1)


@pytest.mark.parametrize(
    ("text", "line", "column"),
    [
        ("(a (b c)", 1, 1),
        ("(a\n (b (c) ", 2, 2),
        ("(a))", 1, 4),
        ("(a)\n)", 2, 1),
        ('(a "b)', 1, 4),
        ('(a\n\n  "b" "', 3, 7),
        (") (", 1, 1),
        ('(a ")" "(" (', 1, 12),
        ("(" * (NESTING_LIMIT + 1), 1, NESTING_LIMIT + 1),
        ("(" * 200_000, 1, NESTING_LIMIT + 1),
    ],
)
def test_damage_is_told_with_its_place(text: str, line: int, column: int) -> None:
    with pytest.raises(InputError) as caught:
        FormParser(text, file="x.edf").parse()
    assert (caught.value.file, caught.value.line, caught.value.column) == ("x.edf", line, column)


def test_the_deepest_nesting_that_is_read() -> None:
    read = FormParser("(" * NESTING_LIMIT + ")" * NESTING_LIMIT).parse()
    depth = 0
    while read:
        [read] = read
        depth += 1
    assert depth == NESTING_LIMIT


class Picky(FormParser):
    def head(self, token: str) -> str | None:
        return None if token == "no" else token.upper()


def test_lists_passed_over_leave_nothing() -> None:
    text = '(a (no (b "x)" (c)) d "%") (no) (no x) (no "s") (no (no (no))) (e (no y)) z)'
    assert Picky(text).parse() == [["A", ["E"], "z"]]
    assert Picky("(a (no (").open_lists() is not None
    for bad, column in (("(a (no (b)", 4), ('(a (no "x', 8), ("(a (no (b)))) ", 13), ("(a (no " + "(" * 300, 7 + 199)):
        with pytest.raises(InputError) as caught:
            Picky(bad).parse()
        assert caught.value.column == column, bad


def test_reducers_replace_lists_as_they_close() -> None:
    parser = FormParser("(a (b 1) (b (b 2)) c)", reducers={"b": lambda form: ("B", *form[1:])})
    assert parser.parse() == [["a", ("B", "1"), ("B", ("B", "2")), "c"]]


def test_lists_of_a_shape_are_what_is_made_of_them() -> None:
    """In any case and spacing, where nothing is passed over; what differs in the least is a list like any other."""
    shapes = {
        "(at ? (in ?))": lambda offset, at, inside: (offset, at, inside),
        '(says ? (text ""))': lambda _, name, text: {name: text},
    }
    plain = '(a (At b(IN c)) ( at\n b ( in\tc ) ) (x (at b (in c)) (says n (text"t 1")))'
    near = '(at b (in c d)) (at b) (says n (text "%")))'
    [read] = Picky(f"{plain} {near}", shapes=shapes).parse()
    assert read[:4] == ["A", (3, "b", "c"), (16, "b", "c"), ["X", (38, "b", "c"), {"n": "t 1"}]]
    assert read[4:] == [["AT", "b", ["IN", "c", "d"]], ["AT", "b"], ["SAYS", "n", ["TEXT", "%"]]]
    assert Picky("(a (no (at b (in c))) (at b (in c)))", shapes=shapes).parse() == [["A", (22, "b", "c")]]


def test_rule_files_keep_everything_and_know_places() -> None:
    text = '(topology x\n  (says "one,\n    two; 5 %")\n  (where (apart a b)))\n(fault y)\n'
    topology, fault = read_forms(text, "rules/x.lisp")
    assert topology == ["topology", "x", ["says", "one, two; 5 %"], ["where", ["apart", "a", "b"]]]
    assert (topology.head, fault.head, fault.line) == ("topology", "fault", 5)
    error = topology[3][1].error("no such net")
    assert str(error) == "rules/x.lisp:4:10: no such net"
    assert Form().head == ""


@pytest.mark.parametrize(("text", "place"), [("(a) b", "1:5"), ('(a)\n"b"', "2:1"), ("(a", "1:1"), ("(a))", "1:4")])
def test_rule_files_with_mistakes(text: str, place: str) -> None:
    with pytest.raises(InputError, match=f"^r.lisp:{place}: "):
        read_forms(text, "r.lisp")


def test_collection_is_as_it_was_afterwards() -> None:
    assert gc.isenabled()
    with pytest.raises(ValueError, match="inside"), no_collection():
        assert not gc.isenabled()
        raise ValueError("inside")
    assert gc.isenabled()
    gc.disable()
    try:
        with no_collection():
            pass
        assert not gc.isenabled()
    finally:
        gc.enable()


def test_what_is_made_while_collection_is_held_back_is_old_afterwards() -> None:
    gc.collect()
    with no_collection():
        made = [[number] for number in range(10_000)]
    young = {id(one) for generation in (0, 1) for one in gc.get_objects(generation)}
    assert young.isdisjoint(map(id, made))
    gc.freeze()
    try:
        with no_collection():
            pass
        assert gc.get_freeze_count() > 0  # a caller's frozen objects stay frozen
    finally:
        gc.unfreeze()
