"""A board of eight like channels, one sound, each of the others with one fault: every fault is named on its own channel."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cache

import pytest

from protlint.findings import Finding
from protlint.pipeline import Review, review
from tests.support.paths import FIXTURES

FAULTS = {
    1: None,
    2: "collector-emitter-swapped",
    3: "base-on-far-end",
    4: "shunt-polarity-wrong",
    5: "collector-not-on-the-drive",
    6: "sense-bypassed",
    7: "channels-unequal",
    8: "channels-unequal",
}
"""What is wrong with each channel: the last two have a value ten and a hundred times what the others have."""

ODD = {7: ("R72",), 8: ("R83",)}


@cache
def reviewed() -> Review:
    here = FIXTURES / "channels"
    return review(here / "quay-lamps.edf", limits=here / "limits.toml", parts=[here / "parts.toml"])


def channels_of(finding: Finding) -> set[int]:
    """Return the channels whose parts a finding names; the channel is the first digit of a designator."""
    return {int(part[1]) for part in finding.parts}


def of(channel: int) -> list[Finding]:
    return [finding for finding in reviewed().findings if channel in channels_of(finding)]


def test_every_finding_is_about_one_channel() -> None:
    for finding in reviewed().findings:
        (channel,) = channels_of(finding)
        assert finding.limiter == f"Q{channel}1"


@pytest.mark.parametrize("channel", [channel for channel, fault in FAULTS.items() if fault])
def test_every_fault_is_named_on_its_channel(channel: int) -> None:
    (finding,) = [finding for finding in of(channel) if finding.check == FAULTS[channel]]
    assert finding.level == ("warning" if channel in ODD else "error")
    assert finding.remedy
    if channel in ODD:
        assert finding.parts == ODD[channel]
    else:
        assert f"Q{channel}2" in finding.parts
        assert len(of(channel)) == 1  # a limiter drawn wrong is not judged besides


def test_nothing_is_said_of_the_good_channel() -> None:
    assert of(1) == []
    assert {one.limiter.id: one.verdict for one in reviewed().limiters}["Q11"] == "passes"


def test_the_table_of_channels(show: Callable[[Sequence[str]], None]) -> None:
    """Print what each channel was given and what was said of it."""
    lines = [f"{'channel':<9}{'drawn':<30}said"]
    for channel, fault in FAULTS.items():
        said = ", ".join(f"{finding.check} ({finding.level})" for finding in of(channel))
        lines.append(f"{channel:<9}{fault or 'sound':<30}{said or 'nothing'}")
    show(lines)
    assert all(bool(of(channel)) == (fault is not None) for channel, fault in FAULTS.items())
