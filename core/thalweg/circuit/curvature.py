"""How sharply the energy rises along each parameter of an excitation program near its reference."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.operators.fermion import FermionHamiltonian

#: Curvatures below this part of the largest are raised to it: there other terms than the reference's own decide.
SMALLEST_PART = 0.01


def reference_curvature(program: ExcitationProgram, hamiltonian: FermionHamiltonian) -> FloatArray | None:
    """d2E/dtheta_k2 of each parameter alone, at zero, shape (K,), energy unit; None where no factor acts on the reference.

    A factor exp(f theta (T - T+)) turns the reference into the determinant T|ref> by the angle f theta, which raises the
    energy by sin^2(f theta) (E_T - E_ref): the curvature is 2 f^2 (E_T - E_ref). Equal excitations add their f first.
    Parameters that leave the reference as it is get the middle of the others.
    """
    weights: dict[tuple[int, tuple[int, int]], float] = {}
    for k, e, factor in zip(program.parameter.tolist(), program.excitations, program.factor.tolist(), strict=True):
        target, sign = _image(e, program.reference)
        if sign:
            weights[k, target] = weights.get((k, target), 0.0) + sign * factor
    if not weights:
        return None
    targets = list(dict.fromkeys(target for _, target in weights))
    rises = dict(zip(targets, _rises(targets, hamiltonian, program.reference), strict=True))
    curvature = np.zeros(program.n_parameters)
    for (k, target), weight in weights.items():
        curvature[k] += 2.0 * weight**2 * rises[target]
    known = np.zeros(program.n_parameters, bool)
    known[[k for k, _ in weights]] = True
    largest = float(np.abs(curvature).max())
    if largest == 0.0:
        return None
    curvature = np.maximum(np.abs(curvature), SMALLEST_PART * largest)
    curvature[~known] = float(np.median(curvature[known]))
    return curvature


def _image(e: Excitation, reference: tuple[int, int]) -> tuple[tuple[int, int], int]:
    """The determinant that T - T+ leads to from the reference; 1 where T does, -1 where T+ does, 0 where neither."""
    for sign in (1, -1):
        image = []
        for mask, source, target in ((reference[0], e.alpha_source, e.alpha_target), (reference[1], e.beta_source, e.beta_target)):
            s, t = (sum(1 << p for p in orbitals) for orbitals in (source, target)[::sign])
            if _moves(mask, s, t):
                image.append((mask ^ s) | t)
        if len(image) == 2 and (image[0], image[1]) != reference:
            return (image[0], image[1]), sign
    return reference, 0


def _moves(mask: int, source: int, target: int) -> bool:
    return mask & source == source and not (mask ^ source) & target


def _rises(targets: list[tuple[int, int]], hamiltonian: FermionHamiltonian, reference: tuple[int, int]) -> list[float]:
    from thalweg.kernels.spin_strings import determinant_energies

    masks = np.array([*targets, reference], dtype=np.uint64)
    one, two = np.ascontiguousarray(hamiltonian.one_body), np.ascontiguousarray(hamiltonian.two_body)
    energies = determinant_energies(masks[:, 0].copy(), masks[:, 1].copy(), one, two)
    rises: list[float] = (energies[:-1] - energies[-1]).tolist()
    return rises
