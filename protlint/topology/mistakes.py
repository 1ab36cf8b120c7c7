"""Mistakes in rule files: collected, and raised all at once."""

from __future__ import annotations

from collections.abc import Iterable

from protlint.netlist.forms import Form
from protlint.sources import InputError


class RuleErrors(InputError):
    """Everything that is wrong in the rule files, one line a mistake; ``mistakes`` holds them one by one."""

    def __init__(self, mistakes: Iterable[InputError]) -> None:
        self.mistakes = tuple(mistakes)
        first = self.mistakes[0]
        super().__init__(first.message, file=first.file, line=first.line, column=first.column)

    def __str__(self) -> str:
        return "\n".join(map(str, self.mistakes))


class Mistakes:
    """The mistakes met so far."""

    def __init__(self) -> None:
        self.found: list[InputError] = []

    def say(self, form: Form, message: str) -> None:
        """Note a mistake at a form's place."""
        self.found.append(form.error(message))

    def settle(self) -> None:
        """Raise all mistakes together, each once, in the order of files and lines, if there are any."""
        if self.found:
            once = {(one.file or "", one.line or 0, one.column or 0, one.message): one for one in self.found}
            raise RuleErrors(once[key] for key in sorted(once))
