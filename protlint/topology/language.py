"""The rules: every rule file read, resolved and multiplied out, ready to match and to be shown."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from protlint.sources import FileError, data_folder, read_bytes, shown_name
from protlint.topology.describe import describe, describe_shapes
from protlint.topology.fitting import plans_for
from protlint.topology.flatten import Pattern, Resolved, flatten, resolve
from protlint.topology.mistakes import Mistakes, RuleErrors
from protlint.topology.plan import Plans
from protlint.topology.read import read_rule_file
from protlint.topology.slips import check_pattern
from protlint.topology.terms import Rule, Shape

__all__ = ["Described", "RuleErrors", "Rules", "load_rules", "own_rules", "read_rules"]

ENDING = ".rule"
"""What a rule file's name ends in."""

LARGEST_RULE_FILE = 4_000_000
"""Bytes; what a person writes is a thousandth of it."""


PART_WORDS = {"pass": "pass device", "driver": "driver", "sense": "sense resistor", "shunt": "shunt"}
"""The parts that sentences of faults speak of; any other name in them is a net's."""


@dataclass(frozen=True, slots=True)
class Described:
    """A topology or a fault as ``protlint rules NAME`` shows it.

    ``says`` is what it is, ``cited`` where it was published, ``used`` where it is met, ``drawing`` its lines of text,
    ``clauses`` its parts and joins in words, a line each; ``builds_on`` the rules it extends, nearest first (for a fault
    the topology it spoils).
    """

    name: str
    says: str
    cited: tuple[str, ...]
    used: str
    drawing: tuple[str, ...]
    clauses: tuple[str, ...]
    builds_on: tuple[str, ...]
    both_polarities: bool
    file: str


@dataclass(frozen=True, slots=True)
class Rules:
    """All rules in use, and the flat patterns made of them."""

    topologies: Mapping[str, Described]
    faults: Mapping[str, Described]
    resolved: Mapping[str, Resolved]
    patterns: tuple[Pattern, ...]
    fault_patterns: tuple[Pattern, ...]
    plans: Plans = field(compare=False, repr=False)
    """How to search for the patterns and the fault patterns, in that order."""
    sound_plans: Plans = field(compare=False, repr=False)
    """How to search for the patterns alone."""


def load_rules(extra_folders: Sequence[str | Path] = ()) -> Rules:
    """Return protlint's own rules together with those of a user's folders.

    Every file whose name ends in ``.rule`` is read, in the folder and below it.

    Raises
    ------
    RuleErrors : rule files hold mistakes; it lists all of them, each with file, line and column.
    FileError : a folder is missing or holds no rule file, or a file cannot be read.
    """
    own = own_rules()
    texts = dict(own)
    for folder in map(Path, extra_folders):
        if not folder.is_dir():
            raise FileError("no such folder", file=shown_name(folder))
        paths = sorted(folder.rglob(f"*{ENDING}"))
        if not paths:
            raise FileError(f"no file here ends in {ENDING}", file=shown_name(folder))
        for path in paths:
            content, name = read_bytes(path, limit=LARGEST_RULE_FILE)
            try:
                texts[name] = content.decode("utf-8-sig")
            except UnicodeDecodeError as error:
                raise FileError(f"this is not UTF-8 text (byte {error.start + 1})", file=name) from None
    return read_rules(texts, proven={name for name, text in own.items() if texts[name] is text})


def own_rules() -> dict[str, str]:
    """Return the texts of protlint's own rule files, by file name."""
    own = data_folder("rules")
    files = sorted(own.rglob(f"*{ENDING}"))
    return {f"rules/{path.relative_to(own).as_posix()}": path.read_text(encoding="utf-8") for path in files}


def read_rules(texts: Mapping[str, str], *, proven: Collection[str] = ()) -> Rules:
    """Return the rules in some files' texts, by file name.

    Files that are ``proven`` are not searched for slips of the pen, which takes a third of the time: protlint's own are when
    it is tested.

    Raises
    ------
    RuleErrors : as :func:`load_rules`.
    """
    mistakes = Mistakes()
    rules: dict[str, Rule] = {}
    shapes: dict[str, Shape] = {}
    for file, text in texts.items():
        found_rules, found_shapes = read_rule_file(text, file, mistakes)
        for rule in found_rules:
            if rule.name in rules:
                mistakes.say(rule.form, f"{rule.name} is there already, in {rules[rule.name].file}")
            rules.setdefault(rule.name, rule)
        for shape in found_shapes:
            if shape.name in shapes:
                mistakes.say(shape.form, f"shape {shape.name} is there already, in {shapes[shape.name].file}")
            shapes.setdefault(shape.name, shape)
    resolved = resolve(rules, mistakes)
    patterns: list[Pattern] = []
    for one in resolved.values():
        flat = flatten(one, shapes, mistakes)
        for pattern in flat if one.rule.file not in proven else ():
            if pattern.polarity == "n":
                check_pattern(pattern, one, mistakes)
        patterns += flat
    mistakes.settle()
    described = {name: _described(one, shapes) for name, one in resolved.items()}
    sound = tuple(one for one in patterns if not one.fault)
    faults = tuple(one for one in patterns if one.fault)
    plans = plans_for((*sound, *faults))
    return Rules(
        topologies={name: one for name, one in described.items() if not rules[name].fault},
        faults={name: one for name, one in described.items() if rules[name].fault},
        resolved=resolved,
        patterns=sound,
        fault_patterns=faults,
        plans=plans,
        sound_plans=Plans(plans.tasks[: len(sound)]),
    )


def _in_general(word: re.Match[str]) -> str:
    """Return what stands for the name of a part or a net where a rule is told by itself."""
    role = word[2].split(".")[0]
    if role not in PART_WORDS:
        return f"net {word[2]}"
    return f"{'another' if word[1] else 'the'} {PART_WORDS[role]}"


def _described(one: Resolved, shapes: Mapping[str, Shape]) -> Described:
    rule = one.rule
    return Described(
        name=rule.name,
        says=re.sub(r"\{(?:(others)\.)?([^{}]+)\}", _in_general, rule.says),
        cited=rule.cited,
        used=rule.used,
        drawing=rule.drawing,
        clauses=(
            *describe(one.body),
            *(f"the load is between {name} and ground" for name in dict(one.grounded)),
            *describe_shapes(one.body, shapes),
        ),
        builds_on=one.ancestors,
        both_polarities=one.mirrored,
        file=rule.file,
    )
