"""The rule language: what a rule file may say, and that every mistake in it is reported with its place, all at once."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from protlint.sources import FileError, InputError
from protlint.topology.language import Rules, load_rules, own_rules, read_rules
from protlint.topology.match import find_limiters
from protlint.topology.mistakes import RuleErrors
from tests.support.boards import board
from tests.support.paths import ROOT

SOUND = """(topology plain
  (says "a limiter")
  (mirrored)
  (shunt npn (collector drive) (base near) (emitter far))
  (pass npn (collector load) (base drive) (emitter near))
  (sense resistor (across near far))
  (nets (drive drive) (sense near) (far far) (output load)))
"""


def rules_of(*texts: str) -> Rules:
    return read_rules({f"{place}.rule": text for place, text in enumerate(texts, 1)})


def mistakes_in(*texts: str) -> list[tuple[str | None, int | None, int | None, str]]:
    with pytest.raises(RuleErrors) as caught:
        rules_of(*texts)
    return [(one.file, one.line, one.column, one.message) for one in caught.value.mistakes]


def replaced(old: str, new: str) -> str:
    assert old in SOUND
    return SOUND.replace(old, new)


def test_a_sound_rule_gives_a_pattern_and_its_mirror() -> None:
    rules = rules_of(SOUND)
    assert [(one.rule, one.polarity) for one in rules.patterns] == [("plain", "n"), ("plain", "p")]
    assert {clause.kinds for clause in rules.patterns[1].clauses} == {("pnp",), ("resistor",)}
    assert rules.topologies["plain"].both_polarities


MISTAKES = [
    (replaced("shunt npn", "shunt valve"), 4, 3, "unknown kind or shape 'valve'"),
    (replaced("(base near)", "(grid near)"), 4, 32, "unknown join or option 'grid'"),
    (replaced("(base near)", "(base near) (base far)"), 4, 44, "pin base is joined twice"),
    (replaced("(collector load)", "(collector lode)"), 1, 1, "net output is to be load"),
    (replaced("(pass npn", "(valve npn"), 5, 3, "unknown role 'valve'"),
    (replaced("(across near far)", "(across near)"), 6, 19, "expected (across NET NET)"),
    (replaced("(across near far)", "(base near)"), 6, 19, "unknown join or option 'base'"),
    (replaced("(across near far)", "(along near far)"), 6, 19, "along does not fit resistor"),
    (replaced("(across near far)", "(path near near)"), 6, 19, "both ends are the same net"),
    (replaced("(across near far)", '(across near far) (under "1 F")'), 6, 37, "is the unit of a capacitance"),
    (replaced("(across near far)", "(path near far) (count 3 1)"), 6, 35, "the least count, 3, is above the most, 1"),
    (replaced("(across near far)", "(path near far) (count some)"), 6, 35, "expected a whole number or many"),
    (replaced("(mirrored)", "(where (hot near))"), 3, 10, "unknown test 'hot'"),
    (replaced("(mirrored)", "(where (ground near far))"), 3, 10, "ground takes 1 net name"),
    (replaced("(mirrored)", "(where (ground elsewhere))"), 1, 1, "asks about elsewhere, which no clause joins"),
    (replaced("(mirrored)", "(may (drive resistor (across one other)))"), 3, 8, "nothing joins this to what must be there"),
    (replaced("(mirrored)", "(compensation capacitor (across one other))"), 3, 3, "nothing joins this compensation"),
    (replaced("(mirrored)", "(compensation capacitor (across near astray))"), 3, 3, "net astray is joined here and nowhere"),
    (replaced("(mirrored)", "(builds-on mirage)"), 1, 1, "builds on mirage, which is no rule"),
    (replaced("(mirrored)", "(either (only (drive resistor (across drive load))))"), 3, 3, "either needs two or more"),
    (replaced("(mirrored)", "(each 2 many)"), 3, 3, "each needs clauses"),
    (replaced("(mirrored)", "(cure (move shunt.base near))"), 3, 3, "unknown role 'cure'"),
    (replaced("(mirrored)", "(grounded-load)"), 3, 3, "expected (grounded-load NET)"),
    (replaced("(mirrored)", '(grounded-load "load")'), 3, 3, "expected (grounded-load NET)"),
    (replaced("(mirrored)", "(grounded-load load far)"), 3, 3, "expected (grounded-load NET)"),
    (replaced("(mirrored)", "(grounded-load lode)"), 3, 3, "the load is to be on lode, which no clause joins"),
    (replaced("(output load)", "(outlet load)"), 7, 46, "unknown net 'outlet'"),
    ('(topology bare (says "x") (sense resistor (across a b)))', 1, 1, "nothing to begin the search at"),
    ("(topology)", 1, 1, "expected the rule's name"),
    ("(recipe plain)", 1, 1, "expected (topology ...), (fault ...) or (shape ...)"),
    ("(topology plain\n  (says unquoted))", 2, 3, 'expected (says "text" ...)'),
    ("(topology plain\n  (shunt npn (collector drive)", 2, 3, "this parenthesis is never closed"),
    ('(topology plain (says "never closed))', 1, 23, "this string is never closed"),
]  # fmt: skip


@pytest.mark.parametrize("text, line, column, says", MISTAKES, ids=[case[3] for case in MISTAKES])
def test_a_mistake_is_reported_with_its_place(text: str, line: int, column: int, says: str) -> None:
    found = mistakes_in(text)
    assert any((line, column) == (one[1], one[2]) and says in one[3] for one in found), found


def test_all_mistakes_of_all_files_come_at_once_in_order() -> None:
    first = replaced("shunt npn", "shunt valve").replace("(pass npn", "(pasture npn")
    found = mistakes_in(first, "(topology other (builds-on plain) (instead-of emitter (sense resistor (across near far))))")
    places = [(file, line) for file, line, _, _ in found]
    assert places == sorted(places)
    assert {("1.rule", 4), ("1.rule", 5), ("2.rule", 1)} <= set(places)


def test_the_error_is_an_input_error_that_lists_every_line() -> None:
    with pytest.raises(InputError) as caught:
        rules_of(replaced("shunt npn", "shunt valve").replace("(pass npn", "(pasture npn"))
    lines = str(caught.value).splitlines()
    assert lines[0].startswith("1.rule:4:3: ") and lines[1].startswith("1.rule:5:3: ")
    assert caught.value.exit_code == 2


def test_rules_that_build_on_each_other_are_refused() -> None:
    circle = '(topology a (builds-on b) (says "x"))\n(topology b (builds-on a) (says "x"))'
    assert any("builds on itself" in one[3] for one in mistakes_in(circle))
    assert any("plain is there already, in 1.rule" in one[3] for one in mistakes_in(SOUND, SOUND))


def test_a_branch_or_a_role_that_the_base_lacks_is_a_mistake() -> None:
    for built, says in (
        ("(builds-on plain transistor)", "plain has no branch 'transistor'"),
        ("(builds-on plain) (instead-of steering)", "plain has no 'steering'"),
    ):
        assert any(says in one[3] for one in mistakes_in(SOUND, f"(topology more {built})"))


def test_a_shape_is_multiplied_out_and_keeps_its_own_names_to_itself() -> None:
    shape = """(shape carrier (load drive near)
      (bipolar (pass npn (collector load) (base drive) (emitter near)))
      (mosfet (pass nmos (drain load) (gate drive) (source near)))
      (follower (driver npn (collector any) (base drive) (emitter far))
                (pass npn (collector load) (base far) (emitter near))))
    """
    used = replaced(
        "(pass npn (collector load) (base drive) (emitter near))",
        "(pass carrier (load load) (drive drive) (near near))",
    )
    rules = rules_of(shape, used)
    assert [one.labels for one in rules.patterns[:3]] == [("bipolar",), ("mosfet",), ("follower",)]
    inner = {name for clause in rules.patterns[2].clauses for name in clause.nets()}
    assert "carrier.far" in inner and "far" in inner
    unfit = used.replace(" (near near)", "")
    assert any("shape carrier joins load, drive, near" in one[3] for one in mistakes_in(shape, unfit))


def test_a_shape_inside_itself_is_a_mistake() -> None:
    shape = "(shape ring (a b) (only (pass ring (a a) (b b))))"
    used = SOUND.replace("(pass npn (collector load) (base drive) (emitter near))", "(pass ring (a load) (b drive))")
    assert any("stands inside itself" in one[3] for one in mistakes_in(shape, used))


def test_instead_of_and_builds_on_change_what_is_named_and_keep_the_rest() -> None:
    more = """(topology stopped (builds-on plain) (says "with a base stop")
      (instead-of shunt (shunt npn (collector drive) (base tap) (emitter far)))
      (base-stop resistor (path near tap)))"""
    rules = rules_of(SOUND, more)
    pattern = next(one for one in rules.patterns if one.rule == "stopped")
    assert [clause.role for clause in pattern.clauses] == ["shunt", "pass", "sense", "base-stop"]
    assert rules.resolved["stopped"].ancestors == ("plain",)
    found = find_limiters(
        board("npn Q1 OUT B E\nnpn Q2 B T GND\nresistor R1 E GND =1\nresistor R2 E T =100\nresistor R3 E X"), rules
    )
    assert [(one.topology, one.roles["base_stop"]) for one in found.limiters] == [("stopped", ("R2",))]


ON_A_SUPPLY = (
    "npn Q1 OUT B E\nnpn Q2 B E +24V\nresistor R1 E +24V =1\nresistor R2 B CMD =100\nconnector J1 1=OUT 2=GND 3=CMD"
)


@pytest.mark.parametrize("built_on", [False, True], ids=["said", "built on"])
def test_a_load_to_ground_tells_which_way_the_current_flows(built_on: bool) -> None:
    """An NPN whose emitter is on +24 V carries nothing out of a load that lies between its collector and ground."""
    said = replaced("(mirrored)", "(mirrored) (grounded-load load)")
    more = ['(topology more (builds-on plain) (says "more"))'] if built_on else []
    for text, limiters, faults in ((SOUND, ["Q1"], []), (said, [], ["pass-polarity-wrong"])):
        found = find_limiters(board(ON_A_SUPPLY), rules_of(text, *more))
        assert ([one.id for one in found.limiters], [one.fault for one in found.faults]) == (limiters, faults)
    assert "the load is between load and ground" in rules_of(said, *more).topologies["more" if built_on else "plain"].clauses
    assert not any("ground" in clause for clause in rules_of(SOUND).topologies["plain"].clauses)


def test_a_rule_may_call_its_nets_anything() -> None:
    """An emitter astray, on the load instead of ground, is told by a rule that knows no net called far or load."""
    text = re.sub("far|load|near", lambda word: f"my-{word[0]}", SOUND.split("(nets")[0])
    rules = rules_of(text + "(nets (drive drive) (sense my-near) (far my-far) (output my-load)))")
    astray = "npn Q1 OUT B E\nnpn Q2 B E OUT\nresistor R1 E GND =1\nresistor R2 B CMD =100\nconnector J1 1=OUT 2=GND 3=CMD"
    (fault,) = find_limiters(board(astray), rules).faults
    assert fault.fault == "shunt-pin-misplaced" and "not on GND, the far end of R1" in fault.says


def test_a_users_folder_adds_rules(tmp_path: Path) -> None:
    folder = tmp_path / "ours"
    folder.mkdir()
    (folder / "own.rule").write_text(SOUND.replace("topology plain", "topology house-limiter"), encoding="utf-8")
    rules = load_rules([folder])
    assert {"house-limiter", "emitter-sensed"} <= set(rules.topologies)
    assert rules.topologies["house-limiter"].file == "own.rule"


def test_a_users_folder_that_is_missing_empty_or_broken_is_said(tmp_path: Path) -> None:
    with pytest.raises(FileError):
        load_rules([tmp_path / "nowhere"])
    with pytest.raises(FileError):
        load_rules([tmp_path])
    (tmp_path / "broken.rule").write_bytes(b"\xff\xfe\x00(")
    with pytest.raises(FileError):
        load_rules([tmp_path])
    (tmp_path / "broken.rule").write_text("(topology emitter-sensed (says unquoted))", encoding="utf-8")
    with pytest.raises(RuleErrors) as caught:
        load_rules([tmp_path])
    assert {one.file for one in caught.value.mistakes} == {"broken.rule"}


def test_the_examples_of_the_readme_are_rules() -> None:
    text = (ROOT / "rules" / "README.md").read_text(encoding="utf-8")
    blocks = re.findall(r"(?:^(?:    .*)?\n)+", text, re.MULTILINE)
    code = [block for block in blocks if block.lstrip().startswith(("(topology", "(shape"))]
    rules = read_rules({f"example {place}": block.split("(pass carrier")[0] for place, block in enumerate(code)})
    assert list(rules.topologies) == ["watched-emitter", "divided-emitter"]


def test_our_own_rules_have_no_slips() -> None:
    """They are taken as proven when they are loaded; here they are not."""
    assert read_rules(own_rules()).patterns == load_rules().patterns


def test_every_rule_of_our_own_says_what_it_is_and_where_it_comes_from() -> None:
    rules = load_rules()
    for one in (*rules.topologies.values(), *rules.faults.values()):
        assert one.says and one.cited and one.clauses, one.name
        assert one.file.startswith("rules/")
    for one in rules.topologies.values():
        assert one.used and one.drawing, one.name
        assert max(map(len, one.drawing)) <= 72
