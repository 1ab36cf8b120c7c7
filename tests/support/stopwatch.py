"""Process time of a piece of work, for measurements that are printed and never judged on a clock alone."""

from __future__ import annotations

import math
import time
from collections.abc import Callable


def seconds(function: Callable[[], object], times: int = 3) -> float:
    """The least process time of several runs."""
    best = math.inf
    for _ in range(times):
        started = time.process_time()
        function()
        best = min(best, time.process_time() - started)
    return best
