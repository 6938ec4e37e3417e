"""How long something takes: the best of some runs, since other work on a machine only adds."""

from __future__ import annotations

import gc
import time

#: Runs end before their number when they have taken this long together, seconds.
PATIENCE_S = 20.0


def best(run, runs=3):
    """Seconds of the fastest of `runs` runs, of fewer when they are long. The first is not thrown away:
    whoever calls has run it once already, to compare the answers, and has touched its memory."""
    times = []
    gc.collect()
    gc.disable()
    try:
        while len(times) < runs and (not times or sum(times) < PATIENCE_S):
            begun = time.perf_counter()
            run()
            times.append(time.perf_counter() - begun)
    finally:
        gc.enable()
    return min(times)
