"""Every file of fixtures/netlist/invalid: one clear error, with the line and column its twin says."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from protlint.netlist import read_netlist
from protlint.sources import InputError
from tests.support.paths import FIXTURES

INVALID = sorted((FIXTURES / "netlist" / "invalid").glob("*.edf"))


def test_there_are_files() -> None:
    assert len(INVALID) >= 30


@pytest.mark.parametrize("path", INVALID, ids=lambda path: path.stem)
def test_the_error_and_its_place(path: Path) -> None:
    twin = json.loads(path.with_suffix(".json").read_text(encoding="utf-8"))
    with pytest.raises(InputError) as caught:
        read_netlist(path)
    error = caught.value
    assert error.file is not None
    assert error.file.endswith(path.name)
    assert twin["says"].lower() in error.message.lower()
    assert (error.line, error.column) == (twin["line"], twin["column"]), str(error)
    assert "\n" not in str(error)
    assert error.exit_code == 2
