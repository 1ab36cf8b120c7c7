"""How fast netlists are read, against sexpdata's own reader on the same text in the same run.

Nothing is asserted on a clock, and runs are small by default. ``PROTLINT_BENCH_PARTS=50000`` and ``PROTLINT_BENCH_REAL=1``
(the 31 MB file of real-edif) measure what the project promises: forms at 5 times ``sexpdata.loads`` or better, a netlist no
slower than ``sexpdata.loads``, at most 12 times the file in memory. ``PROTLINT_BENCH_LINE=200000`` shows that time grows in
line with the board. Times are of the processor, not of the wall, so that other work on the machine counts less.
"""

from __future__ import annotations

import gzip
import math
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
import sexpdata

from protlint.netlist import read_netlist_bytes
from protlint.netlist.forms import FormParser, no_collection
from tests.support.board_writer import Habits, random_board, write
from tests.support.paths import SHARED
from tests.support.stopwatch import seconds

PARTS = int(os.environ.get("PROTLINT_BENCH_PARTS", "1500"))
LARGEST = int(os.environ.get("PROTLINT_BENCH_LINE", "4000"))
REAL = SHARED / "real-edif" / "aes.edf.gz"


def board_text(parts: int, habits: Habits | None = None) -> str:
    """A generated board; without backslashes, which sexpdata takes as escapes."""
    return write(random_board(parts, seed=1), habits or Habits(), seed=1)[0].replace("\\", "")


def texts() -> list[tuple[str, str]]:
    found = [
        (f"flat board of {PARTS} parts", board_text(PARTS)),
        (f"drawn board of {PARTS} parts", board_text(PARTS, Habits(pages=8, drawing=True, renames=True, blocks=3))),
    ]
    if "PROTLINT_BENCH_REAL" in os.environ and REAL.is_file():
        found.append(("aes.edf", gzip.decompress(REAL.read_bytes()).decode()))
    return found


def test_reading_against_bare_loads() -> None:
    for name, text in texts():
        times = 1 if len(text) > 5_000_000 else 3
        data = text.encode()

        def forms(text: str = text) -> object:
            with no_collection():
                return FormParser(text).parse()

        bare = seconds(lambda text=text: sexpdata.loads(text), times)
        tree = seconds(forms, times)
        netlist = seconds(lambda data=data: read_netlist_bytes(data, "board.edf"), times)
        print(f"\n{name}, {len(data) / 1e6:.1f} MB: sexpdata.loads {bare:.3f} s")
        print(f"  forms {tree:.3f} s, {bare / tree:.1f} times as fast")
        print(f"  read_netlist {netlist:.3f} s, {netlist / bare:.2f} of loads")
        assert len(read_netlist_bytes(data, "board.edf").parts) > 0


STATUS = Path("/proc/self/status")


def peak_MB(code: str, file: Path) -> float:
    """Most memory a process of its own ever held."""
    code += f"\nprint(open({str(STATUS)!r}).read())"
    done = subprocess.run([sys.executable, "-c", code, str(file)], capture_output=True, text=True, check=True)
    [peak] = re.findall(r"VmHWM:\s*(\d+) kB", done.stdout)
    return int(peak) / 1024


@pytest.mark.skipif(not STATUS.exists(), reason="SKIPPED LOUDLY: no /proc to ask for the peak of a process")
def test_peak_memory_against_the_file(tmp_path: Path) -> None:
    for name, text in texts():
        file = tmp_path / "board.edf"
        file.write_text(text, encoding="utf-8")
        idle = peak_MB("import sys, protlint.netlist", file)
        reading = peak_MB("import sys, protlint.netlist; kept = protlint.netlist.read_netlist(sys.argv[1])", file)
        size = file.stat().st_size / 2**20
        print(
            f"\n{name}, {size:.1f} MB: peak {reading:.0f} MB, {reading / size:.1f} times the file;"
            f" {idle:.0f} MB of it before reading, {(reading - idle) / size:.1f} times the file above that"
        )
        assert reading > idle


def test_time_grows_in_line_with_the_board() -> None:
    points = []
    for parts in [1000 * 2**step for step in range(20) if 1000 * 2**step < LARGEST] + [LARGEST]:
        data = board_text(parts).encode()
        points.append((parts, seconds(lambda data=data: read_netlist_bytes(data, "board.edf"), 2)))
        assert len(read_netlist_bytes(data, "board.edf").parts) == parts
    logs = [(math.log(parts), math.log(spent)) for parts, spent in points]
    mean_x, mean_y = (sum(values) / len(logs) for values in zip(*logs, strict=True))
    slope = sum((x - mean_x) * (y - mean_y) for x, y in logs) / sum((x - mean_x) ** 2 for x, _ in logs)
    shown = ", ".join(f"{parts}: {spent:.3f} s ({spent / parts * 1e6:.0f} us a part)" for parts, spent in points)
    print(f"\nparts to seconds: {shown}; time grows as parts to the power {slope:.2f}")
    assert len(points) >= 2
