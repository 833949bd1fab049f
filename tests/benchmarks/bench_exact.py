"""Bar B10: the own Lanczos search against scipy's eigsh, both on the same action of H (Heisenberg ring, S_z = 0)."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np
from scipy.sparse.linalg import LinearOperator, eigsh

from thalweg.exact.lanczos import Level, lowest_state, random_start
from thalweg.exact.spin_basis import basis_of, sorted_strings
from thalweg.exact.spin_blocks import RunsBlock
from thalweg.systems.lattice import Chain
from thalweg.systems.spin_models import Heisenberg
from thalweg.watch import SILENT

Row = dict[str, object]


def b10_lanczos() -> list[Row]:
    """20 and 22 sites: eigsh at its default accuracy, then stopped at the accuracy of the own search."""
    return [_against(sites, tolerance) for sites, tolerance in ((20, 0.0), (20, 1e-10), (22, 1e-10))]


def _against(sites: int, eigsh_tolerance: float) -> Row:
    expansion = Heisenberg().hamiltonian(Chain(sites=sites))
    block = RunsBlock(basis_of(sites, sites // 2), sorted_strings(expansion), SILENT)
    start = random_start(block.dimension, block.dtype, 1)
    applied = 0

    def action(vector: Any) -> Any:
        nonlocal applied
        applied += 1
        out = np.empty_like(start)
        block.apply(np.ascontiguousarray(vector), out)
        return out

    operator = LinearOperator((block.dimension, block.dimension), matvec=action, dtype=block.dtype)
    limit = 1e-10 * expansion.one_norm

    def own() -> Level:
        return lowest_state(block.apply, start, is_enough=lambda energy, residual: residual <= limit, watch=SILENT)

    def other() -> Any:
        return eigsh(operator, k=1, which="SA", v0=start, tol=eigsh_tolerance)

    found = own()
    energies, vectors = other()
    applied_once = applied
    assert found.converged
    assert abs(found.energy - energies[0]) < 1e-9
    assert abs(abs(np.vdot(found.vector, vectors[:, 0])) - 1.0) < 1e-9
    pairs = [(_seconds(own), _seconds(other)) for _ in range(3)]
    ours, theirs = min(a for a, _ in pairs), min(b for _, b in pairs)
    accuracy = "default accuracy" if eigsh_tolerance == 0.0 else f"tolerance {eigsh_tolerance:g}"
    counts = f"{found.steps} against {applied_once} actions of H"
    text = f"{sites} sites, {block.dimension:,} states: eigsh ({accuracy}) {theirs:.2f} s / Thalweg {ours:.2f} s, {counts}, at least"
    return {"bar": "B10", "text": text, "measured": theirs / ours, "limit": 2.5, "met": theirs / ours >= 2.5}


def _seconds(work: Callable[[], Any]) -> float:
    begun = time.perf_counter()
    work()
    return time.perf_counter() - begun


BARS = [b10_lanczos]
