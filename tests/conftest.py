"""What every test shares: the root on the path, the habits of hypothesis, and tables that are shown below the results."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path

import pytest
from hypothesis import settings

ROOT = Path(__file__).parent.parent
sys.path.insert(0, str(ROOT))

# A busy machine is no failure, and in CI the same commit has to give the same answer.
settings.register_profile("protlint", deadline=None, derandomize="CI" in os.environ)
settings.load_profile("protlint")

TABLES = pytest.StashKey[list[str]]()


@pytest.fixture
def show(pytestconfig: pytest.Config) -> Callable[[Sequence[str]], None]:
    """Take lines to be shown below the results of the whole run, where no dot breaks them."""
    shown = pytestconfig.stash.setdefault(TABLES, [])

    def take(lines: Sequence[str]) -> None:
        shown.extend(("", *lines))

    return take


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter, config: pytest.Config) -> None:
    for line in config.stash.get(TABLES, []):
        terminalreporter.write_line(line)
