"""What a whole review costs, against sexpdata's own reader on the same text in the same run.

Nothing is asserted on a clock, and runs are small and few by default. ``PROTLINT_BENCH_PARTS=20000 PROTLINT_BENCH_RUNS=3``
measures what the project promises: a board of 20,000 parts with eight limiters, all different and all solved, reviewed from
its files to the printed report no slower than ``sexpdata.loads`` reads its text. That holds of boards as they are written;
it does not of the tangle, whose every sixth part is a transistor wired at random to its neighbours, where its netlist is
bare besides: half as many bytes a part as any large netlist of the reference files has. Times are of the processor, each in
a process of its own, as the command would spend them; what importing costs is told apart.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

from protlint.netlist import read_netlist
from protlint.pipeline import review
from tests.support.crowd import EXPORTED, ORDINARY, crowd_drawn
from tests.support.edif_text import flat_netlist, schematic_pages

PARTS = int(os.environ.get("PROTLINT_BENCH_PARTS", "500"))
RUNS = int(os.environ.get("PROTLINT_BENCH_RUNS", "1"))
LIMITERS = 8
REMARK = "an invented crowd of parts"

LOADS = """
import sys, time
started = time.process_time()
import sexpdata
text = open(sys.argv[1], encoding="utf-8").read()
imported = time.process_time()
sexpdata.loads(text)
"""
REVIEW = """
import sys, time
started = time.process_time()
import protlint.pipeline, protlint.report.document, protlint.report.text
imported = time.process_time()
protlint.report.text.rendered_text(protlint.report.document.document(protlint.pipeline.review(sys.argv[1])))
"""
TOLD = "import json; print(json.dumps([imported - started, time.process_time() - imported]))"


def spent(work: str, file: Path) -> tuple[float, float]:
    """Return the least seconds of some processes: for the imports, and for the work."""
    runs = []
    for _ in range(RUNS):
        done = subprocess.run([sys.executable, "-c", work + TOLD, str(file)], capture_output=True, text=True, check=True)
        runs.append(json.loads(done.stdout))
    imports, works = zip(*runs, strict=True)
    return min(imports), min(works)


def test_a_whole_review_against_bare_loads(tmp_path: Path) -> None:
    parts = crowd_drawn(PARTS, limiters=LIMITERS)
    told = crowd_drawn(PARTS, limiters=LIMITERS, more=EXPORTED)
    ordinary = crowd_drawn(PARTS, limiters=LIMITERS, kinds=ORDINARY)
    boards = {
        "flat and bare, an ordinary mix of kinds": flat_netlist("CROWD", ordinary, remark=REMARK),
        "flat and bare, a tangle of transistors": flat_netlist("CROWD", parts, remark=REMARK),
        "flat with the properties of exports, a tangle": flat_netlist("CROWD", told, remark=REMARK),
        "drawn on pages, a tangle": schematic_pages("CROWD", parts, remark=REMARK, pages=8),
    }
    for name, text in boards.items():
        file = tmp_path / "crowd.edf"
        file.write_text(text, encoding="utf-8")
        bare_import_s, bare_s = spent(LOADS, file)
        import_s, review_s = spent(REVIEW, file)
        each = file.stat().st_size / PARTS
        print(
            f"\n{name}, {PARTS} parts of {each:.0f} bytes: sexpdata.loads {bare_s:.2f} s; the review {review_s:.2f} s, "
            f"{review_s / bare_s:.2f} of it; with the imports ({bare_import_s:.2f} and {import_s:.2f} s) "
            f"{(import_s + review_s) / (bare_import_s + bare_s):.2f}"
        )
        assert len(read_netlist(file).parts) == len(parts)
        solved = {one.limiter.id for one in review(file).limiters if one.solution.not_solved is None}
        assert solved >= {f"QP{number}" for number in range(1, LIMITERS + 1)}  # chance may make others
