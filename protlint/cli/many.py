"""Several netlists in one go: on all cores, in the order given, none lost because another cannot be read."""

from __future__ import annotations

import contextlib
import os
import signal
import sys
import threading
from collections.abc import Iterable, Iterator, Mapping, Sequence
from concurrent.futures import Future, ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from dataclasses import replace
from multiprocessing import active_children, get_context, parent_process
from multiprocessing.connection import wait
from pathlib import Path
from typing import Any

from protlint.cli.shell import CANNOT
from protlint.sources import FileError, ProtlintError, UsageError, shown_name

ENDINGS = (".edf", ".edif", ".edn")
"""What a netlist in a folder ends in."""

FEW, SMALL_BYTES = 3, 300_000
"""So few netlists, so small together, are reviewed sooner than further processes have started."""

Answer = dict[str, Any]
"""A report, or where ``unread`` is set the place and message of what went wrong."""


def reviewed(netlists: Sequence[str], files: Mapping[str, Any], reading: Mapping[str, Any]) -> dict[str, Any]:
    """Return the report of a netlist, or of several and of folders one together, those that cannot be reviewed in it.

    ``files`` are the keyword arguments of :func:`protlint.pipeline.set_up`, ``reading`` those of ``read_netlist``.

    Raises
    ------
    ProtlintError : a folder holds no netlist, a file is missing or wrong; of several netlists one besides them.
    """
    from protlint import pipeline
    from protlint.report.document import document
    from protlint.report.shape import combined

    paths, together = netlists_of(netlists)
    if not together:
        return document(pipeline.review(paths[0], **files, **reading))
    answers = _review_all(paths, files, reading)
    failed = [answer for answer in answers if "unread" in answer]
    return combined((answer for answer in answers if "unread" not in answer), failed)


def errors_of(unread: Sequence[Mapping[str, Any]]) -> list[str]:
    """Return what could not be reviewed as lines for standard error."""
    places = ("file", "line", "column")
    return [str(ProtlintError(error["message"], **{key: error[key] for key in places})) for error in unread]


def netlists_of(arguments: Sequence[str]) -> tuple[list[str], bool]:
    """Return the netlists that arguments name, folders opened, and whether they make a combined report.

    Raises
    ------
    FileError : a folder holds no netlist.
    UsageError : a name is empty, which would be the working folder.
    """
    paths: list[str] = []
    if "" in arguments:
        raise UsageError("a netlist without a name: is a variable of the command line empty?")
    for argument in arguments:
        paths += _in_folder(Path(argument)) if argument != "-" and Path(argument).is_dir() else [argument]
    unique = list({_whole(path): path for path in paths}.values())
    return unique, len(arguments) > 1 or unique != list(arguments)


def called(paths: Sequence[str]) -> dict[str, str]:
    """Return what each netlist goes by; one outside the working folder with as much of its way as no other shares."""
    names = {path: shown_name(path) for path in paths if path != "-"}
    ways = {path: Path(_whole(path)).parts for path in names}
    for path in names:
        if Path.cwd() not in Path(_whole(path)).parents:
            others = [way for other, way in ways.items() if other != path]
            length = 1
            while any(way[-length:] == ways[path][-length:] for way in others):
                length += 1
            names[path] = "/".join(ways[path][-length:])
    return names


def _review_all(paths: Sequence[str], files: Mapping[str, Any], reading: Mapping[str, Any]) -> list[Answer]:
    """Return a report or an error for each netlist, in the order given.

    ``files`` are the keyword arguments of :func:`protlint.pipeline.set_up`, ``reading`` those of ``read_netlist``.

    Raises
    ------
    ProtlintError : a file besides the netlists is missing or wrong.
    """
    from protlint import pipeline

    desk = pipeline.set_up(**files)
    names = called(paths)
    # What is no file on a disk, such as a pipe, another process may have no way to.
    here = [path for path in paths if path == "-" or not Path(path).is_file() or not _worth_sharing(paths)]
    elsewhere = {path: names[path] for path in paths if path not in here}
    answers: dict[str, Answer] = {}
    for path, answer in _with_progress(_on_all_cores(elsewhere, files, reading), len(elsewhere)):
        answers[path] = answer
    ours = ((path, _answer(path, names.get(path), desk, reading)) for path in here)
    for path, answer in _with_progress(ours, len(here)):
        answers[path] = answer
    return [answers[path] for path in paths]


def _whole(path: str) -> str:
    return path if path == "-" else os.path.abspath(path)  # noqa: PTH100 - a link is another netlist than what it points to


def _in_folder(folder: Path) -> list[str]:
    found = sorted(
        path
        for path in folder.rglob("*")
        if path.suffix.lower() in ENDINGS
        and (path.is_file() or (path.is_symlink() and not path.is_dir()))  # a link that leads nowhere is told of
        and not any(part.startswith(".") for part in path.relative_to(folder).parts)
    )
    if not found:
        raise FileError(f"no file in this folder ends in {', '.join(ENDINGS)}", file=shown_name(folder))
    return [str(path) for path in found]


def _worth_sharing(paths: Sequence[str]) -> bool:
    """Tell whether there is more work than starting other processes costs."""
    if cores() == 1 or len(paths) < 2:
        return False
    sizes = [Path(path).stat().st_size for path in paths if Path(path).is_file()]
    return len(paths) > FEW or sum(sizes) > SMALL_BYTES


def cores() -> int:
    """Return how many cores this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _on_all_cores(
    names: Mapping[str, str], files: Mapping[str, Any], reading: Mapping[str, Any]
) -> Iterator[tuple[str, Answer]]:
    """Yield each netlist's answer as it comes; ``names`` are what the netlists go by.

    A worker that is ended from outside, as for want of memory, takes its pool with it: what was left is then done one
    after another, and only a netlist that ends its worker again is lost.
    """
    left, workers = dict(names), cores()
    while left:
        for path, answer in _in_a_pool(left, min(workers, len(left)), files, reading):
            del left[path]
            yield path, answer
        if left and workers == 1:
            # Work is taken in order: the first without an answer is the one that was being done.
            path = next(iter(left))
            yield path, _unread(left.pop(path), "its review ended abruptly twice, perhaps for want of memory")
        workers = 1


def _in_a_pool(
    names: Mapping[str, str], workers: int, files: Mapping[str, Any], reading: Mapping[str, Any]
) -> Iterator[tuple[str, Answer]]:
    """Yield the answers that a pool of workers gives before one of them is ended from outside, if any is."""
    pool = ProcessPoolExecutor(workers, get_context("spawn"), initializer=_prepare, initargs=(files, reading))
    before = signal.signal(signal.SIGTERM, _leave)
    try:
        with _undisturbed():
            waiting: dict[Future[Answer], str] = {pool.submit(_work, *item): item[0] for item in names.items()}
        for future in as_completed(waiting):
            if not isinstance(future.exception(), BrokenProcessPool):
                yield waiting[future], future.result()
            else:
                _kill_workers()
    except BaseException:
        _kill_workers()
        raise
    finally:
        pool.shutdown(cancel_futures=True)
        signal.signal(signal.SIGTERM, before)


def _kill_workers() -> None:
    """End the workers at once: they heed no order to end, so that a pool would wait for them for ever."""
    for worker in active_children():
        worker.kill()


def _leave(number: int, _frame: object) -> None:
    """Leave in an orderly way where an order to end would leave the workers alone, with the exit code shells give for it."""
    raise SystemExit(128 + number)


@contextlib.contextmanager
def _undisturbed() -> Iterator[None]:
    """Start processes whole, and such that no interrupt and no order to end reaches them: the parent answers those."""
    orders: list[int] = []
    stopping = (signal.SIGINT, signal.SIGTERM)
    before = {number: signal.signal(number, lambda number, _frame: orders.append(number)) for number in stopping}
    # What this thread holds back its processes hold back; what another thread of this process takes is noted above.
    held = signal.pthread_sigmask(signal.SIG_BLOCK, stopping) if hasattr(signal, "pthread_sigmask") else None
    try:
        yield
    finally:
        if held is not None:
            signal.pthread_sigmask(signal.SIG_SETMASK, held)
        for number, handler in before.items():
            signal.signal(number, handler)
    for order in orders:
        signal.raise_signal(order)


_worker: dict[str, Any] = {}
"""What one worker process keeps between netlists."""


def _prepare(files: Mapping[str, Any], reading: Mapping[str, Any]) -> None:
    threading.Thread(target=_end_with_the_parent, daemon=True).start()
    # Every core has a worker already: more threads for small matrices would only get in each other's way.
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    from protlint import pipeline

    _worker.update(desk=pipeline.set_up(**files), reading=reading)


def _end_with_the_parent() -> None:
    """Leave when the parent has gone, however it went: a pool's worker would wait for work for ever."""
    parent = parent_process()
    if parent is not None:
        wait([parent.sentinel])
        os._exit(CANNOT)


def _work(path: str, name: str) -> Answer:
    return _answer(path, name, _worker["desk"], _worker["reading"])


def _answer(path: str, name: str | None, desk: Any, reading: Mapping[str, Any]) -> Answer:
    from protlint import pipeline
    from protlint.netlist import read_netlist
    from protlint.report.document import document

    try:
        netlist = read_netlist(path, **reading)
        return document(pipeline.review_netlist(replace(netlist, file=name or netlist.file), desk))
    except ProtlintError as error:
        file = name if error.file == shown_name(path) else error.file
        return _unread(file or shown_name(path), error.message, error.line, error.column)
    except (MemoryError, RecursionError) as error:
        return _unread(name or path, f"needs more memory than there is ({type(error).__name__})")
    except Exception as error:
        return _unread(name or path, f"a fault of protlint's own ({type(error).__name__}: {error})")


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
