"""Several netlists in one go: on all cores, in the order given, none lost because another cannot be read."""

from __future__ import annotations

import os
import signal
import sys
from collections.abc import Iterable, Iterator, Mapping, Sequence
from concurrent.futures import Future, ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from multiprocessing import get_context
from pathlib import Path
from typing import Any

from protlint.sources import FileError, ProtlintError, shown_name

ENDINGS = (".edf", ".edif", ".edn")
"""What a netlist in a folder ends in."""

FEW, SMALL_BYTES = 3, 300_000
"""So few netlists, so small together, are reviewed sooner than further processes have started."""

Answer = dict[str, Any]
"""A report, or where ``unread`` is set the place and message of what went wrong."""


def netlists_of(arguments: Sequence[str]) -> tuple[list[str], bool]:
    """Return the netlists that arguments name, folders opened, and whether they make a combined report.

    Raises
    ------
    FileError : a folder holds no netlist.
    """
    paths: list[str] = []
    for argument in arguments:
        paths += _in_folder(Path(argument)) if argument != "-" and Path(argument).is_dir() else [argument]
    unique = list(dict.fromkeys(paths))
    return unique, len(arguments) > 1 or unique != list(arguments)


def review_all(paths: Sequence[str], files: Mapping[str, Any], reading: Mapping[str, Any]) -> list[Answer]:
    """Return a report or an error for each netlist, in the order given.

    ``files`` are the keyword arguments of :func:`protlint.pipeline.set_up`, ``reading`` those of ``read_netlist``.

    Raises
    ------
    ProtlintError : a file besides the netlists is missing or wrong.
    """
    from protlint import pipeline

    desk = pipeline.set_up(**files)
    here = [path for path in paths if path == "-" or not _worth_sharing(paths)]
    elsewhere = [path for path in paths if path not in here]
    answers: dict[str, Answer] = {}
    for path, answer in _with_progress(_on_all_cores(elsewhere, files, reading), len(elsewhere)):
        answers[path] = answer
    for path, answer in _with_progress(((path, _answer(path, desk, reading)) for path in here), len(here)):
        answers[path] = answer
    return [answers[path] for path in paths]


def _in_folder(folder: Path) -> list[str]:
    found = sorted(
        path
        for path in folder.rglob("*")
        if path.suffix.lower() in ENDINGS
        and path.is_file()
        and not any(part.startswith(".") for part in path.relative_to(folder).parts)
    )
    if not found:
        raise FileError(f"no file in this folder ends in {', '.join(ENDINGS)}", file=shown_name(folder))
    return [str(path) for path in found]


def _worth_sharing(paths: Sequence[str]) -> bool:
    """Tell whether there is more work than starting other processes costs."""
    if _cores() == 1 or len(paths) < 2:
        return False
    sizes = [Path(path).stat().st_size for path in paths if Path(path).is_file()]
    return len(paths) > FEW or sum(sizes) > SMALL_BYTES


def _cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _on_all_cores(
    paths: Sequence[str], files: Mapping[str, Any], reading: Mapping[str, Any]
) -> Iterator[tuple[str, Answer]]:
    """Yield each netlist's answer as it comes."""
    if not paths:
        return
    workers = min(_cores(), len(paths))
    with ProcessPoolExecutor(workers, get_context("spawn"), initializer=_prepare, initargs=(files, reading)) as pool:
        waiting: dict[Future[Answer], str] = {pool.submit(_work, path): path for path in paths}
        for future in as_completed(waiting):
            try:
                yield waiting[future], future.result()
            except BrokenProcessPool:
                yield waiting[future], _unread(waiting[future], "its review ended abruptly, perhaps for want of memory")


_worker: dict[str, Any] = {}
"""What one worker process keeps between netlists."""


def _prepare(files: Mapping[str, Any], reading: Mapping[str, Any]) -> None:
    # The parent answers an interrupt; a worker just ends, without a trace of its own.
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    # Every core has a worker already: more threads for small matrices would only get in each other's way.
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    from protlint import pipeline

    _worker.update(desk=pipeline.set_up(**files), reading=reading)


def _work(path: str) -> Answer:
    return _answer(path, _worker["desk"], _worker["reading"])


def _answer(path: str, desk: Any, reading: Mapping[str, Any]) -> Answer:
    from protlint import pipeline
    from protlint.netlist import read_netlist
    from protlint.report.document import document

    try:
        return document(pipeline.review_netlist(read_netlist(path, **reading), desk))
    except ProtlintError as error:
        return _unread(error.file or shown_name(path), error.message, error.line, error.column)
    except (MemoryError, RecursionError) as error:
        return _unread(shown_name(path), f"needs more memory than there is ({type(error).__name__})")
    except Exception as error:
        return _unread(shown_name(path), f"a fault of protlint's own ({type(error).__name__}: {error})")


def _unread(file: str, message: str, line: int | None = None, column: int | None = None) -> Answer:
    return {"unread": True, "file": file, "line": line, "column": column, "message": message}


def _with_progress(answers: Iterable[tuple[str, Answer]], total: int) -> Iterator[tuple[str, Answer]]:
    """Pass answers on, with a counting line on standard error where a person watches it."""
    watched = total > 1 and sys.stderr is not None and sys.stderr.isatty()
    for done, answer in enumerate(answers, 1):
        if watched:
            sys.stderr.write(f"\r{done} of {total} netlists reviewed")
            sys.stderr.flush()
        yield answer
    if watched:
        sys.stderr.write("\r\x1b[K")
        sys.stderr.flush()
