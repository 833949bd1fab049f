"""How many processor threads the numerical libraries may take. Call before numpy is imported: they read it once."""

from __future__ import annotations

import os

#: Loops over integrals and determinants, which gain from a few threads.
LOOPS = ("OMP_NUM_THREADS", "NUMEXPR_NUM_THREADS", "NUMBA_NUM_THREADS")
#: Dense algebra. The matrices of a search are small, and a threaded library then waits for itself: on two busy cores one step of
#: L-BFGS-B with 40 parameters took 7 ms with two threads and 0.04 ms with one.
ALGEBRA = ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "BLIS_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")

#: More threads than this bring nothing for the sizes that a study has.
MOST = 4


def usable_cores() -> int:
    """Cores that this process may run on (a batch system or a container may allow fewer than there are)."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def cap_threads(spared: int = 0) -> None:
    """Loops take the usable cores but `spared`, at least one and at most MOST; dense algebra one. What the person has set stays."""
    loops = max(1, min(MOST, usable_cores() - spared))
    for name in LOOPS:
        os.environ.setdefault(name, str(loops))
    for name in ALGEBRA:
        os.environ.setdefault(name, "1")
