"""The quantum metric tensor (Fubini-Study): g_ij = Re <d_i psi|d_j psi> - <d_i psi|psi><psi|d_j psi> (Stokes et al. 2020)."""

from __future__ import annotations

from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation, ExcitationProgram, GateProgram, Program
from thalweg.errors import StudyError
from thalweg.kernels import derivatives as kernels
from thalweg.kernels.bits import excitation_pairs
from thalweg.operators.sector_layout import StringSpace, sector_spaces


def metric_bytes(program: Program) -> int:
    """Memory of the derivative vectors and of the metric."""
    if isinstance(program, ExcitationProgram):
        amplitudes, size = program.sector.dimension, 8
    else:
        amplitudes, size = 1 << program.n_qubits, 16
    return size * amplitudes * (program.n_parameters + 2) + 16 * program.n_parameters**2


def metric_tensor(program: Program, parameters: FloatArray, *, budget_bytes: int) -> FloatArray:
    """Shape (K, K), from the derivative vectors of the state; StudyError where these do not fit the budget."""
    needed = metric_bytes(program)
    if needed > budget_bytes:
        raise StudyError(
            "The metric tensor does not fit the memory budget",
            f"the derivatives of the state by {program.n_parameters:,} parameters need {needed / 2**30:.3g} GiB",
            "Allow more memory, or choose an optimiser without the metric",
            "memory_gib",
        )
    psi, slopes, order = _excitations(program, parameters) if isinstance(program, ExcitationProgram) else _gates(program, parameters)
    overlaps = slopes.conj().T @ psi
    ordered = (slopes.conj().T @ slopes).real - np.outer(overlaps, overlaps.conj()).real
    metric: FloatArray = np.empty_like(ordered)
    metric[np.ix_(order, order)] = ordered
    return metric


def _excitations(program: ExcitationProgram, parameters: FloatArray) -> tuple[Any, Any, IntArray]:
    sector = program.sector
    alpha_space, beta_space = sector_spaces(sector, np.zeros(sector.n_orbitals, np.int64))
    alpha, alpha_of = _pairs(alpha_space, [(e.alpha_source, e.alpha_target) for e in program.excitations])
    beta, beta_of = _pairs(beta_space, [(e.beta_source, e.beta_target) for e in program.excitations])
    live = np.array([not _is_identity(e) for e in program.excitations], bool)
    parameter, factor = np.asarray(program.parameter, np.int64)[live], np.asarray(program.factor, float)[live]
    columns, order = _columns(parameter, program.n_parameters)
    psi = np.zeros(sector.dimension)
    for amplitude, *masks in program.begins:
        row, column = (int(np.flatnonzero(s.strings == np.uint64(m))[0]) for s, m in zip((alpha_space, beta_space), masks, strict=True))
        psi[row * beta_space.size + column] = amplitude
    slopes = np.zeros((psi.size, program.n_parameters))
    factors = np.stack([alpha_of, beta_of], axis=1)[live]
    kernels.excitation_slopes(psi, slopes, columns, beta_space.size, alpha, beta, factors, factor * parameters[parameter], factor)
    return psi, slopes, order


def _gates(program: GateProgram, parameters: FloatArray) -> tuple[Any, Any, IntArray]:
    psi = np.zeros(1 << program.n_qubits, complex)
    psi[program.reference] = 1.0
    slopes = np.zeros((psi.size, program.n_parameters), complex)
    turned = program.parameter >= 0
    columns, order = np.full(program.parameter.size, -1, np.int64), np.empty(0, np.int64)
    columns[turned], order = _columns(program.parameter[turned], program.n_parameters)
    angles = program.factor.copy()
    angles[turned] *= np.asarray(parameters, float)[program.parameter[turned]]
    kernels.gate_slopes(psi, slopes, program.kind, program.x, program.z, columns, angles, program.factor)
    return psi, slopes, order


def _columns(parameter: IntArray, count: int) -> tuple[IntArray, IntArray]:
    """The column of each factor, columns in the order in which parameters first act, and the parameter of each column, shape (K,)."""
    found, first = np.unique(parameter, return_index=True)
    acting = found[np.argsort(first, kind="stable")]
    order = np.concatenate([acting, np.setdiff1d(np.arange(count), acting)]).astype(np.int64)
    place = np.empty(count, np.int64)
    place[order] = np.arange(count)
    return place[parameter], order


def _pairs(space: StringSpace, excitations: list[tuple[tuple[int, ...], tuple[int, ...]]]) -> tuple[tuple[Any, ...], IntArray]:
    """(first (E + 1,), start, end, sign) of the different excitations of one spin, and which of them each one is, shape (F,)."""
    known: dict[Any, int] = {}
    which = np.array([known.setdefault(e, len(known)) for e in excitations], np.int64)
    lists = [excitation_pairs(space.strings, space.inverse, space.binomial, np.array(a, np.int64), np.array(b, np.int64)) for a, b in known]
    first = np.concatenate([[0], np.cumsum([pairs[0].size for pairs in lists])]).astype(np.int64)
    joined = [np.concatenate([pairs[i] for pairs in lists]) if lists else np.empty(0) for i in range(3)]
    return (first, joined[0].astype(np.int64), joined[1].astype(np.int64), joined[2].astype(float)), which


def _is_identity(e: Excitation) -> bool:
    return e.alpha_source == e.alpha_target and e.beta_source == e.beta_target
