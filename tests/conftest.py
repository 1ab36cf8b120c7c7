"""What every test shares: the root on the path, the habits of hypothesis, and tables that are shown below the results."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

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


def pytest_sessionfinish(session: pytest.Session) -> None:
    """Hand the tables of a process that runs a share of the tests to the one that shows the results."""
    handed: dict[str, object] | None = getattr(session.config, "workeroutput", None)
    if handed is not None:
        handed["tables"] = session.config.stash.get(TABLES, [])


@pytest.hookimpl(optionalhook=True)
def pytest_testnodedown(node: Any) -> None:
    """Take the tables of a process that has run its share."""
    node.config.stash.setdefault(TABLES, []).extend(getattr(node, "workeroutput", {}).get("tables", []))


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter, config: pytest.Config) -> None:
    for line in config.stash.get(TABLES, []):
        terminalreporter.write_line(line)
