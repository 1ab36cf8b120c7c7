"""Two reports compared: what is matched, what moved, which findings are new, and no noise from names."""

from __future__ import annotations

import copy
import hashlib
import json
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from protlint.compare import compare, compare_together
from protlint.report.compare_text import comparison_document, held_back_by, rendered_comparison, rendered_comparison_json
from protlint.report.document import document
from protlint.report.layout import COLUMNS, width
from protlint.report.shape import Document, combined
from tests.report.test_text import ACTING
from tests.support.paths import ROOT
from tests.support.sample_review import HOSTILE, PLAIN, sample_review

SCHEMAS = {
    name: json.loads((ROOT / f"protlint/report/{name}-1.schema.json").read_text(encoding="utf-8"))
    for name in ("review", "compare")
}

RENUMBERED = {**PLAIN, "pass": "Q77", "sense": "R70", "shunt": "Q78", "base_stop": "R71", "drive": "R72", "out": "NEW_OUT"}


def report(names: dict[str, str] = PLAIN, notes: int = 0) -> Document:
    return json.loads(json.dumps(document(sample_review(names, notes=notes))))  # type: ignore[no-any-return]


def quiet(comparison: dict[str, Any]) -> bool:
    limiters, findings = comparison["limiters"], comparison["findings"]
    return not any(
        (limiters["added"], limiters["removed"], limiters["changed"], *(findings[key] for key in ("new", "gone", "risen")))
    )


def test_the_same_board_shows_nothing() -> None:
    comparison = compare(report(notes=3), report(notes=3))
    assert quiet(comparison)
    assert comparison["limiters"]["unchanged"] == 3
    assert comparison["findings"]["unchanged"] == 6


def test_renumbered_designators_and_renamed_nets_make_no_noise() -> None:
    assert quiet(compare(report(), report(RENUMBERED)))


def test_the_order_of_limiters_makes_no_noise() -> None:
    after = report(RENUMBERED)
    after["limiters"].reverse()
    assert quiet(compare(report(), after))


def test_a_changed_part_is_named_with_what_it_moves() -> None:
    after = report(RENUMBERED)
    limiter = next(one for one in after["limiters"] if one["id"] == "Q77")
    next(part for part in limiter["parts"] if part["role"] == "sense")["value"] = 2.0
    for row in limiter["currents"]:
        row["holds_A"] /= 2.0
    (change,) = compare(report(), after)["limiters"]["changed"]
    assert (change["before"], change["after"]) == ("Q10", "Q77")
    assert change["figures"]["holds_A"]["after"] == pytest.approx(0.367 / 2.0, rel=1e-5)
    assert set(change["figures"]) == {"holds_A"}
    (part,) = change["parts"]
    assert (part["role"], part["before"]["id"], part["after"]["id"], part["after"]["value"]) == ("sense", "R11", "R70", 2.0)
    assert part["moves_holds"] == pytest.approx(2.0**-0.9 - 1.0)


def test_one_of_like_channels_changed_is_the_one_told() -> None:
    before = report()
    one = before["limiters"][0]
    before["limiters"] = [{**copy.deepcopy(one), "id": f"Q{number}"} for number in range(10, 18)]
    before["findings"] = []
    after = copy.deepcopy(before)
    after["limiters"][4]["parts"][1]["value"] = 0.5
    after["limiters"].reverse()
    changed = compare(before, after)["limiters"]["changed"]
    assert [(change["before"], change["after"]) for change in changed] == [("Q14", "Q14")]


def test_what_the_limits_file_asks_now_is_told_in_words() -> None:
    before, after = report(), report()
    needs = after["limiters"][0]["needs"]
    needs |= {"carry_A": None, "short_continuous": True, "shorted_to": ["GND", "-5V"]}
    needs["peak"] = {"current_A": 1.5, "lasts_s": 0.02, "output_V": None}
    after["limiters"][0]["loop"]["least_damping"] = None
    text = " ".join(rendered_comparison(comparison_document(compare(before, after))).split())
    for told in (
        "carry 0.7 A, now not stated",
        "a continuous short not stated, now stated",
        "shorted_to not stated, now GND, -5V",
        "peak not stated, now 1.5 A for 20 ms",
        "damping: 0.223, now not known",
    ):
        assert told in text


def test_a_need_that_changed_alone_is_told() -> None:
    after = report()
    after["limiters"][0]["needs"]["carry_A"] = 0.8
    comparison = compare(report(), after)
    assert [change["needs"] for change in comparison["limiters"]["changed"]] == [{"carry_A": {"before": 0.7, "after": 0.8}}]
    assert comparison["limiters"]["unchanged"] == 2
    assert "limits file: carry 0.7 A, now 0.8 A" in rendered_comparison(comparison_document(comparison))


def test_what_the_limits_file_fits_no_longer_is_told() -> None:
    before, after = report(), report()
    after["remarks"] = [*before["remarks"], "limits.toml: [drive.CMD] fits no net and no pin on this board"]
    comparison = compare(before, after)
    assert comparison["remarks"] == {"new": after["remarks"][-1:], "gone": []}
    assert "fits no net and no pin" in rendered_comparison(comparison_document(comparison))
    back = compare(after, before)
    assert back["remarks"]["gone"] == after["remarks"][-1:]
    assert "fits no net" not in rendered_comparison(comparison_document(back))


def test_added_and_removed_limiters() -> None:
    before, after = report(), report()
    gone = after["limiters"].pop()
    comparison = compare(before, after)
    assert [one["id"] for one in comparison["limiters"]["removed"]] == [gone["id"]]
    assert [one["id"] for one in compare(after, before)["limiters"]["added"]] == [gone["id"]]


def test_a_limiter_that_a_wiring_fault_takes_out_is_not_said_to_be_removed() -> None:
    before, after = report(), report()
    gone = after["limiters"].pop()
    assert f"{gone['id']} removed: " in rendered_comparison(comparison_document(compare(before, after)))
    fault = {**copy.deepcopy(after["findings"][0]), "check": "pass-pins-exchanged", "fingerprint": "pass-pins-exchanged-1"}
    after["findings"].append({**fault, "limiter": gone["id"]})
    text = rendered_comparison(comparison_document(compare(before, after)))
    assert f"{gone['id']} no longer a working limiter: " in text
    back = rendered_comparison(comparison_document(compare(after, before)))
    assert f"{gone['id']} now a working limiter: " in back


def test_findings_new_gone_and_risen_and_the_gate_on_them() -> None:
    before, after = report(), report(RENUMBERED)
    new = {**copy.deepcopy(after["findings"][0]), "check": "cap-exceeded", "fingerprint": "cap-exceeded-1"}
    after["findings"].append(new)
    comparison = comparison_document(compare(before, after))
    assert [one["check"] for one in comparison["findings"]["new"]] == ["cap-exceeded"]
    assert held_back_by(comparison, "new:error") == ["1 new error"]
    assert held_back_by(comparison, "never") == []
    new["waived"] = "seen"
    assert held_back_by(comparison_document(compare(before, after)), "new:note") == []
    back = comparison_document(compare(after, before))
    assert [one["check"] for one in back["findings"]["gone"]] == ["cap-exceeded"]
    assert held_back_by(back, "new:note") == []
    lower = copy.deepcopy(before)
    lower["findings"][0]["level"] = "warning"
    risen = comparison_document(compare(lower, before))
    assert [one["check"] for one in risen["findings"]["risen"]] == ["carry-not-met"]
    assert held_back_by(risen, "new:error") == ["1 new error"]


def test_a_fault_moved_to_another_part_is_new_where_nothing_was_renumbered() -> None:
    before, after = report(), report()
    fault = next(one for one in after["findings"] if one["limiter"] is None)
    fault.update(parts=["Q41"], fingerprint="collector-emitter-swapped-other")
    comparison = compare(before, after)
    assert len(comparison["findings"]["new"]) == len(comparison["findings"]["gone"]) == 1


def together(*names: str, unread: tuple[str, ...] = ()) -> Document:
    """Return a report of several boards with the sample's limiters."""
    boards = [report({**PLAIN, "name": name}) for name in names]
    for board, name in zip(boards, names, strict=True):
        board["netlist"] |= {"design": name, "sha256": hashlib.sha256(name.encode()).hexdigest()}
    return combined(boards, [{"file": name, "line": 3, "column": 9, "message": "not EDIF"} for name in unread])


def test_boards_added_removed_and_unread_are_told_and_the_gate_is_over_all() -> None:
    before = together("old/a.edf", "old/b.edf", "old/c.edf")
    after = together("new/a.edf", "new/d.edf", unread=("new/c.edf",))
    after["boards"][0]["findings"].append({**after["boards"][0]["findings"][0], "check": "cap-exceeded"})
    comparison = comparison_document(compare_together(before, after))
    files = [[side and side["file"] for side in (one["before"], one["after"])] for one in comparison["boards"]]
    assert files == [["old/a.edf", "new/a.edf"], [None, "new/d.edf"], ["old/b.edf", None]]
    assert [one["file"] for one in comparison["not_compared"]] == ["new/c.edf"]
    (on_a,) = comparison["boards"][0]["findings"]["new"]
    on_d = comparison["boards"][1]["findings"]["new"]
    assert on_a["check"] == "cap-exceeded"
    errors = 1 + sum(one["level"] == "error" and one["waived"] is None for one in on_d)
    assert errors > 1
    assert held_back_by(comparison, "new:error") == [f"{errors} new errors"]
    text = rendered_comparison(comparison)
    assert "new/d.edf, added: limiters 3 added; " in text
    assert "old/b.edf, removed: limiters 3 removed; " in text
    assert "  - new/c.edf:3:9: not EDIF" in text
    assert max(width(line) for line in text.splitlines()) <= COLUMNS


def test_boards_without_limiters_that_came_or_went_are_named_only() -> None:
    bare = {**report({**PLAIN, "name": "bare.edf"}), "limiters": [], "findings": []}
    side = together("a.edf", "b.edf")
    more = combined([*side["boards"], bare])
    text = rendered_comparison(comparison_document(compare_together(side, more)))
    assert "3 boards together: 1 added, 2 unchanged; " in text
    assert "\nAdded, without a limiter: bare.edf\n" in text
    back = rendered_comparison(comparison_document(compare_together(more, side)))
    assert "3 boards together: 1 removed, 2 unchanged; " in back
    assert "\nRemoved, without a limiter: bare.edf\n" in back


def test_boards_that_did_not_change_are_named_only() -> None:
    side = together("a.edf", "b.edf")
    comparison = comparison_document(compare_together(side, combined([report({**PLAIN, "name": "a.edf"})])))
    assert "\nUnchanged: a.edf\n" in rendered_comparison(comparison)
    assert held_back_by(comparison, "new:note") == []
    noted = {**side, "remarks": ["limits.toml: [limiter.Q99] fits no limiter on this board"]}
    text = rendered_comparison(comparison_document(compare_together(side, noted)))
    assert "\nRemarks that are new\n  - limits.toml: [limiter.Q99] fits no limiter" in text
    same = comparison_document(compare_together(side, side))
    assert "\nUnchanged: a.edf, b.edf\n" in rendered_comparison(same)
    one = together("a.edf")
    assert rendered_comparison(comparison_document(compare_together(one, one))).startswith("1 board: 1 unchanged; ")


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names(name: str) -> None:
    before, after = report(), report({**PLAIN, **dict.fromkeys(("pass", "sense", "out", "name"), name)})
    after["limiters"][0]["parts"][1]["value"] = 2.0
    after["findings"].append({**after["findings"][0], "check": "cap-exceeded"})
    text = rendered_comparison(comparison_document(compare(before, after)))
    assert max(width(line) for line in text.split("\n")) <= COLUMNS
    assert not ACTING.search(text)


def test_what_is_no_report_is_refused_by_an_error_callers_expect() -> None:
    with pytest.raises((KeyError, TypeError, IndexError)):
        compare({"report": 1}, report())


def errors(comparison: Document) -> list[str]:
    """What the shipped schema has against a comparison, as it is saved."""
    saved = json.loads(rendered_comparison_json(comparison_document(comparison)))
    return [error.message for error in Draft202012Validator(SCHEMAS["compare"]).iter_errors(saved)]


def much_changed() -> tuple[Document, Document]:
    """Two reports that differ in all a comparison tells of: limiters, parts, figures, words, needs, findings, remarks."""
    before, after = report(notes=2), report(RENUMBERED, notes=2)
    after["limiters"].pop()
    after["limiters"].append({**copy.deepcopy(after["limiters"][0]), "id": "Q99", "parts": []})
    limiter = after["limiters"][0]
    limiter["verdict"] = "passes"
    limiter["needs"] |= {
        "carry_A": None, "short_continuous": True, "shorted_to": ["GND"],
        "peak": {"current_A": 1.5, "lasts_s": 0.02, "output_V": None},
    }  # fmt: skip
    limiter["parts"].pop()
    limiter["parts"][1]["value"] = 2.0
    for row in limiter["currents"]:
        row["holds_A"] /= 2.0
    before["findings"][0]["level"] = "note"
    after["findings"].append({**after["findings"][0], "check": "cap-exceeded", "fingerprint": "cap-exceeded-1"})
    after["findings"].pop(1)
    after["remarks"] = ["limits.toml: [drive.CMD] fits no net and no pin on this board"]
    return before, after


def test_a_saved_comparison_keeps_to_its_schema() -> None:
    Draft202012Validator.check_schema(SCHEMAS["compare"])
    before, after = much_changed()
    comparison = compare(before, after)
    changed = comparison["limiters"]["changed"]
    assert all(any(one[what] for one in changed) for what in ("words", "figures", "parts", "needs"))
    assert all(comparison["findings"][what] for what in ("new", "gone", "risen"))
    assert errors(comparison) == []
    assert errors(compare(after, before)) == []
    one, other = together("a.edf", "b.edf"), together("a.edf", "c.edf", unread=("b.edf",))
    assert errors(compare_together(one, other)) == []
    assert errors(compare_together(combined([before]), combined([after]))) == []


def test_the_schema_of_comparisons_refuses_a_missing_an_unknown_and_a_wrong_key() -> None:
    before, after = much_changed()
    comparison = compare(before, after)
    for key in comparison:
        assert errors({name: value for name, value in comparison.items() if name != key})
    assert errors({**comparison, "extra": 1})
    for spoil in ({"extra": 1}, {"level": "fatal"}, {"parts": "Q1"}):
        comparison = compare(before, after)
        comparison["findings"]["new"][0] |= spoil
        assert errors(comparison)
    comparison = compare(before, after)
    comparison["limiters"]["changed"][0]["figures"]["ohms"] = {"before": 1.0, "after": 2.0}
    assert errors(comparison)
    several = compare_together(together("a.edf"), together("a.edf"))
    several["boards"][0]["extra"] = 1
    assert errors(several)


def test_both_schemas_say_the_same_of_what_both_hold() -> None:
    review, comparing = SCHEMAS["review"]["$defs"], SCHEMAS["compare"]["$defs"]

    def plain(one: Document) -> Document:
        return {key: value for key, value in one.items() if key not in ("description", "additionalProperties")}

    assert plain(comparing["finding"]) == plain(review["finding"])
    assert comparing["netlist"] == review["report"]["properties"]["netlist"]
    assert comparing["verdict"] == review["limiter"]["properties"]["verdict"]
    assert comparing["peak"] == review["needs"]["properties"]["peak"]
    assert comparing["change"]["properties"]["needs"]["properties"].keys() == review["needs"]["properties"].keys()
    part = review["part"]["properties"]
    assert comparing["part"]["properties"] == {key: part[key] for key in comparing["part"]["required"]}
    assert comparing["change"]["properties"]["parts"]["items"]["properties"]["role"] == part["role"]
