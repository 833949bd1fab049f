"""How many processor threads the numerical libraries may take. Call before numpy is imported: they read it once."""

from __future__ import annotations

import os

VARIABLES = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS", "NUMBA_NUM_THREADS")

#: The matrices of a study are small: more threads than this wait for each other.
MOST = 4


def usable_cores() -> int:
    """Cores that this process may run on (a batch system or a container may allow fewer than there are)."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def cap_threads() -> None:
    """At most MOST threads, never more than the usable cores; a variable that the person has set stays."""
    count = str(min(MOST, usable_cores()))
    for name in VARIABLES:
        os.environ.setdefault(name, count)
