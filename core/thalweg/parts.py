"""Long loops in compiled code, done part by part: a stop is noticed between parts, and threads share them where that pays.

The compiled code releases the interpreter lock, so plain threads are enough and no two threads ever meet inside a parallel region.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor

from thalweg.watch import Watch

#: Work below this many elementary steps (amplitudes times operations, 1 to 4 ms) is left to one thread: handing parts to threads takes
#: some 0.1 ms. Layered circuits share from 17 or 18 qubits.
SHARED_FROM = 2**22

_pools: dict[tuple[int, int], ThreadPoolExecutor] = {}


def allowed_threads() -> int:
    """What NUMBA_NUM_THREADS allows to loops; one thread where it is not set."""
    text = os.environ.get("NUMBA_NUM_THREADS", "1")
    return max(1, int(text)) if text.isdigit() else 1


def run_parts(task: Callable[[int, int, int], float], count: int, cost: int, part: int, watch: Watch, threads: int = 1) -> float:
    """Calls task(first, last, worker) on ranges that cover 0:count and adds the results, in the order of the ranges.

    `cost` is that of one item; a range costs about `part` at most. Workers are numbered from 0 below `threads`; no two calls with one
    worker number run at a time. Which range goes to which worker depends on these numbers alone.
    """
    shared = threads > 1 and count > 1 and count * cost >= SHARED_FROM
    step = max(1, part // max(1, cost))
    if shared:
        step = min(step, -(-count // threads))
    total = 0.0
    for batch in _batches(count, step, threads if shared else 1):
        watch.check()
        if len(batch) == 1:
            total += task(*batch[0], 0)
        else:
            calls = [_pool(threads).submit(task, first, last, worker) for worker, (first, last) in enumerate(batch)]
            total += sum(call.result() for call in calls)
    return total


def _batches(count: int, step: int, size: int) -> Iterator[list[tuple[int, int]]]:
    for first in range(0, count, step * size):
        yield [(start, min(count, start + step)) for start in range(first, min(count, first + step * size), step)]


def _pool(threads: int) -> ThreadPoolExecutor:
    """One pool a process: a forked process must not use its parent's threads."""
    key = (os.getpid(), threads)
    if key not in _pools:
        _pools[key] = ThreadPoolExecutor(threads, thread_name_prefix="parts")
    return _pools[key]
