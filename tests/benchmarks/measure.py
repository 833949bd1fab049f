"""Measures the performance bars and prints one table: bar, measured, limit, met or not.

    python tests/benchmarks/measure.py            every bar
    python tests/benchmarks/measure.py B5 B6      those bars alone

Every figure is a ratio taken inside one run (the two sides interleaved, the least of several times, one thread), because absolute times
differ between machines; the machine's own figures are printed above the table.
"""

from __future__ import annotations

import os

for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "NUMBA_NUM_THREADS"):
    os.environ[_name] = "1"  # before numpy is imported

import datetime
import importlib.util
import platform
import re
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

HERE = Path(__file__).resolve().parent
Row = dict[str, object]


def main(wanted: list[str]) -> int:
    """Prints the table; exit status 1 where a bar is missed."""
    sys.path[:0] = [str(HERE.parents[1] / "core"), str(HERE.parents[1] / "app"), str(HERE), str(HERE.parent), str(HERE.parents[1])]
    print(f"{datetime.date.today()}  {platform.processor() or platform.machine()}  Python {platform.python_version()}  numpy {np.__version__}")
    print(f"in-place scale of 256 MiB: {bandwidth() / 1e9:.1f} GB/s read + write; DGEMM: {gemm_rate() / 1e9:.1f} GF/s, one thread\n")
    print(f"{'bar':<4} {'measured':>12} {'limit':>12}  met  what")
    missed = 0
    for function in bars(wanted):
        for row in function():
            met = bool(row["met"])
            missed += not met
            print(
                f"{row['bar']!s:<4} {_number(row['measured']):>12} {_number(row['limit']):>12}  {'yes' if met else 'NO '}  {row['text']}", flush=True
            )
    return 1 if missed else 0


def bars(wanted: list[str]) -> list[Callable[[], list[Row]]]:
    """The functions of all bench_*.py whose name starts with a wanted bar; all of them when none is named. Sorted by bar."""
    found: list[Callable[[], list[Row]]] = []
    for path in sorted(HERE.glob("bench_*.py")):
        spec = importlib.util.spec_from_file_location(path.stem, path)
        assert spec is not None
        assert spec.loader is not None
        module = importlib.util.module_from_spec(spec)
        sys.modules[path.stem] = module
        spec.loader.exec_module(module)
        found += [f for f in module.BARS if not wanted or _bar(f) in {w.upper() for w in wanted}]
    return sorted(found, key=lambda f: int(_bar(f)[1:]))


def bandwidth() -> float:
    """Bytes per second of x *= 1 on an array larger than the caches: it is read once and written once."""
    x = np.ones(2**25)
    best = min(_timed(lambda: np.multiply(x, 1.0000001, out=x)) for _ in range(5))
    return 2 * x.nbytes / best


def gemm_rate() -> float:
    a = np.random.default_rng(1).normal(size=(1000, 1000))
    return 2e9 / min(_timed(lambda: a @ a) for _ in range(5))


def _timed(work: Callable[[], object]) -> float:
    begun = time.perf_counter()
    work()
    return time.perf_counter() - begun


def _bar(function: Callable[[], list[Row]]) -> str:
    """`B5` of a function named `b5_product` or `bar_b5`."""
    match = re.search(r"b(\d+)", function.__name__)
    if match is None:
        raise SystemExit(f"{function.__name__} names no bar")
    return "B" + match[1]


def _number(value: object) -> str:
    return f"{value:.4g}" if isinstance(value, float | int) else str(value)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
