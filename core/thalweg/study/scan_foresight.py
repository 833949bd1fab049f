"""How long a scan will take, told before it starts: one point is prepared and one evaluation timed."""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np

from thalweg.study.executors import START_UP, usable_cores
from thalweg.study.problem import Problem, make_engine, prepare, sector_product
from thalweg.study.scan_spec import BLOCK, ScanSpec
from thalweg.systems.molecule import Molecule
from thalweg.watch import SILENT, Watch

#: Evaluations of a search that starts from a neighbour (common for UCCSD with L-BFGS-B), and of one without a second-order model.
QUICK_SEARCH, SLOW_SEARCH = 30, 400
QUICK = frozenset({"l-bfgs-b", "slsqp"})
#: Seconds that loading and compiling may take; a preparation that takes longer is not repeated to time it.
LOADING = 8.0
#: Products with H that an exact diagonalisation takes, over all irreps.
PRODUCTS = 80


def foresee(scan: ScanSpec, workers: int = 0, watch: Watch = SILENT) -> float:
    """Seconds that the whole scan will take on this machine, good to a factor of two or so.

    Raises StudyError where the middle point cannot be prepared, Stopped when asked to stop.
    """
    middle = len(scan.points) // 2
    spec = scan.at(scan.points[middle])
    begun = time.perf_counter()
    problem = prepare(spec, watch)
    preparing = time.perf_counter() - begun
    if preparing < LOADING and middle:  # the first one may have loaded the numerical libraries
        begun = time.perf_counter()
        problem = prepare(scan.at(scan.points[middle - 1]), watch, problem.prepared.seed)
        preparing = time.perf_counter() - begun
    engine = make_engine(problem, watch)
    point = np.full(engine.n_parameters, 1e-3)
    engine.energy_and_gradient(point)  # compiled and loaded before it is timed
    searching = _evaluations(problem) * timed(lambda: engine.energy_and_gradient(point))
    followed = isinstance(spec.system, Molecule) and spec.system.active_space.strip().lower() not in ("", "all")
    each = preparing + searching + (_diagonalising(problem) if spec.exact else 0.0)
    runs = len(scan.points) * (2 if scan.both_directions else 1) + len(scan.points) // BLOCK
    alone = runs * each + (len(scan.points) * preparing if followed else 0.0)
    count = min(workers or usable_cores(), -(-len(scan.points) // BLOCK))
    return min(alone, START_UP + alone / count)


def timed(work: Callable[[], object]) -> float:
    """Seconds that it takes, from the better of two runs."""
    found = []
    for _ in range(2):
        begun = time.perf_counter()
        work()
        found.append(time.perf_counter() - begun)
    return min(found)


def _evaluations(problem: Problem) -> int:
    spec = problem.spec
    usual = QUICK_SEARCH if spec.optimizer.key in QUICK else SLOW_SEARCH
    return spec.starts * (min(usual, spec.stop.evaluations) if spec.stop.evaluations else usual)


def _diagonalising(problem: Problem) -> float:
    """From one product with H for electrons; for sites the search is left out of account."""
    if problem.prepared.fermions is None:
        return 0.0
    product = sector_product(problem)
    block = product.block(product.reference_irrep)
    vector = np.full(block.layout.size, 1.0)
    begun = time.perf_counter()
    block.apply(vector)
    building = time.perf_counter() - begun
    return product.n_irreps * building + PRODUCTS * timed(lambda: block.apply(vector))
