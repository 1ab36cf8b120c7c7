"""Waivers: findings that somebody looked at and accepted, with a reason and a name.

A waived finding stays in every report, marked; it does not fail the gate. A date is looked at here and nowhere else: past
its ``until`` a waiver no longer counts.
"""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from datetime import date, datetime
from pathlib import Path, PurePosixPath

from protlint.findings import Finding
from protlint.limits import fits
from protlint.sources import FileError, UsageError, read_bytes, shown_name, write_whole
from protlint.toml.file import load_toml
from protlint.toml.tables import Table
from protlint.toml.text import toml_string

try:
    import fcntl
except ImportError:  # not a POSIX system
    fcntl = None  # type: ignore[assignment]

MATCHES_NOTHING = "this waiver matches nothing"
"""How the remark on an idle waiver ends; of several boards it counts only where it is idle on all."""

KEYS = ("fingerprint", "check", "part", "board", "reason", "by", "until")


@dataclass(frozen=True, slots=True)
class Waiver:
    """One waiver: by ``fingerprint``, or by ``check`` and ``part`` (globs), and where it stands in its file.

    ``board`` is the end of a netlist's file name (globs), where one waivers file serves several boards: designators, and
    with them fingerprints, may be the same on two of them.
    """

    reason: str
    by: str
    fingerprint: str | None = None
    check: str | None = None
    part: str | None = None
    board: str | None = None
    until: date | None = None
    line: int = 1
    column: int = 1

    def covers(self, finding: Finding) -> bool:
        """Tell whether the waiver speaks of a finding."""
        if self.board is not None and not PurePosixPath(finding.file or "").match(self.board):
            return False
        if self.fingerprint is not None:
            return self.fingerprint == finding.fingerprint
        names = (*finding.parts, *((finding.limiter,) if finding.limiter else ()))
        return fits(self.check or "", finding.check) and any(fits(self.part or "", name) for name in names)


@dataclass(frozen=True, slots=True)
class Waivers:
    """A waivers file."""

    file: str
    entries: tuple[Waiver, ...]


def load_waivers(path: str | Path) -> Waivers:
    """Return the waivers of a file.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : not TOML, an unknown key, or a waiver without reason, name or subject, with its place.
    """
    root = Table.whole(load_toml(path))
    root.only(("waiver",), called="table")
    return Waivers(root.document.file, tuple(_waiver(table) for table in root.tables("waiver")))


def apply_waivers(
    findings: Iterable[Finding], waivers: Waivers, *, on: date | None = None
) -> tuple[tuple[Finding, ...], tuple[str, ...]]:
    """Return the findings with the waived ones marked, and what is to be said of waivers that are spent or match nothing.

    ``on`` is the day that ``until`` is judged by (a waiver holds through its last day); today where None.
    """
    listed = tuple(findings)
    today = on or (date.today() if any(waiver.until for waiver in waivers.entries) else date.min)
    live = [waiver for waiver in waivers.entries if waiver.until is None or today <= waiver.until]
    marked = tuple(_marked(finding, live) for finding in listed)
    remarks = []
    for waiver in waivers.entries:
        place = f"{waivers.file}:{waiver.line}:{waiver.column}"
        covered = [finding for finding in listed if waiver.covers(finding)]
        if not covered:
            remarks.append(f"{place}: {MATCHES_NOTHING}")
        elif waiver.until is not None and today > waiver.until:
            counting = [one.fingerprint for one in covered if not any(other.covers(one) for other in live)]
            again = f"; what it covered counts again: {', '.join(counting)}" if counting else ""
            remarks.append(f"{place}: this waiver ended on {waiver.until.isoformat()}{again}")
    return marked, tuple(remarks)


def add_waiver(path: str | Path, waiver: Waiver, *, on: date | None = None) -> None:
    """Add a waiver at the end of a file, made where it is absent; every line that stands there stays as it is.

    ``on`` is the day it is added; today where None.

    Raises
    ------
    FileError : the file cannot be read or written.
    InputError : what stands in the file is no waivers file.
    UsageError : the fingerprint is waived already, or the waiver would end before it begins.
    """
    today = on or date.today()
    if waiver.until is not None and waiver.until < today:
        raise UsageError(f"{waiver.until.isoformat()} is past: such a waiver covers nothing")
    with _alone_in(Path(path).parent):
        before = ""
        if Path(path).exists():
            _refuse_another(load_waivers(path), waiver, today)
            before = read_bytes(path)[0].decode("utf-8")
        write_whole(path, before + _written(waiver, before))


def _refuse_another(standing: Waivers, waiver: Waiver, today: date) -> None:
    for other in standing.entries:
        if (other.fingerprint, other.board) == (waiver.fingerprint, waiver.board) and waiver.fingerprint is not None:
            past = other.until is not None and other.until < today
            until = f" until {other.until}" if other.until is not None else ""
            message = f"already waived by {other.by}{until}{', which is past: put a later date there' if past else ''}"
            raise UsageError(message, file=standing.file, line=other.line, column=other.column)


def _written(waiver: Waiver, before: str) -> str:
    """Return a waiver as it goes behind what stands in a file, with the line ends that are in use there."""
    rows = [""] * (bool(before) + (bool(before) and not before.endswith("\n"))) + ["[[waiver]]"]
    for key in KEYS[:-1]:
        text = getattr(waiver, key)
        rows += [f"{key} = {toml_string(text)}"] if text is not None else []
    rows += [f"until = {waiver.until.isoformat()}"] if waiver.until is not None else []
    line_end = "\r\n" if "\r\n" in before else "\n"
    return line_end.join(rows) + line_end


@contextlib.contextmanager
def _alone_in(folder: Path) -> Iterator[None]:
    """Let no other process that adds a waiver in a folder come between, where the system can lock a folder."""
    if fcntl is None:
        yield
        return
    try:
        place = os.open(folder, os.O_RDONLY)
    except OSError as error:
        raise FileError(f"cannot be written in ({error.strerror})", file=shown_name(folder)) from None
    try:
        with contextlib.suppress(OSError):  # a file system that has no locks
            fcntl.flock(place, fcntl.LOCK_EX)
        yield
    finally:
        os.close(place)


def _waiver(table: Table) -> Waiver:
    table.only(KEYS)
    texts = {key: table.text(key) for key in KEYS if key != "until"}
    for key in ("reason", "by"):
        if texts[key] is None:
            raise table.error(f'a waiver needs a "{key}"')
    by_glob = texts["check"] is not None and texts["part"] is not None
    either = texts["check"] is not None or texts["part"] is not None
    if (texts["fingerprint"] is None and not by_glob) or (texts["fingerprint"] is not None and either):
        raise table.error('a waiver has a "fingerprint", or a "check" with a "part"')
    line, column = table.document.place(table.path)
    return Waiver(
        reason=texts["reason"] or "",
        by=texts["by"] or "",
        fingerprint=texts["fingerprint"],
        check=texts["check"],
        part=texts["part"],
        board=texts["board"],
        until=_until(table),
        line=line,
        column=column,
    )


def _until(table: Table) -> date | None:
    content = table.content.get("until")
    if content is None:
        return None
    if not isinstance(content, date) or isinstance(content, datetime):
        raise table.error('"until" is a date without quotes, such as 2027-06-30', "until")
    return content


def _marked(finding: Finding, live: Sequence[Waiver]) -> Finding:
    waiver = next((one for one in live if one.covers(finding)), None)
    return finding if waiver is None else replace(finding, waived=waiver.reason, waived_by=waiver.by)
