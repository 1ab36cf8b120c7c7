"""What keeps a limiter from being judged: values nobody can read, parts nobody knows, pins on two nets."""

from __future__ import annotations

from collections.abc import Iterator

from protlint.checks.case import Answer, Case


def value_unreadable(case: Case) -> Iterator[Answer]:
    """Yield a finding for each part on the bench whose value cannot be read, quoting its text."""
    for part_id in case.bench.parts_without_value:
        part = case.part(part_id)
        text = part.values.text
        said = f'has the value "{text}", which cannot be read' if text else "states no value"
        why = f" ({part.values.unreadable})" if part.values.unreadable else ""
        yield case.finding(
            "value-unreadable",
            f"{part_id} {said}{why}",
            parts=(part_id,),
            working=(),
            remedy=f"write the value of {part_id} as a number with its unit (4k7, 0.22R, 100n)",
            subject=part_id,
        )


def part_data_missing(case: Case) -> Iterator[Answer]:
    """Yield a finding for each transistor or diode of the limiter that the part data does not know."""
    roles = ("pass", "driver", "shunt", "steering")
    for part_id in case.parts(*roles):
        part = case.part(part_id)
        if part.kind == "resistor" or part.entry is not None:
            continue
        number = f"part number {part.part_number}" if part.part_number else "no part number"
        yield case.finding(
            "part-data-missing",
            f"{part_id} ({number}) is in no part data: figures usual for its kind were taken, with a wide spread",
            parts=(part_id,),
            working=(),
            remedy="add its ratings to a part-data file and give it with --parts"
            if part.part_number
            else f"give {part_id} a part number",
            subject=part_id,
        )
