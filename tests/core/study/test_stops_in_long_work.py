"""A stop is heard inside each long computation, at whatever place it comes; the number of looks is held, since times differ between machines.

Measured on two cores of the AVX-512 class, the longest stretch of computing without a look: full CI of N2 in STO-3G 80 ms, a gradient on
20 qubits 23 ms, 60 qubits with every integral non-zero 300 ms (one sort of 1.1 million strings).
"""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.ansatz import HardwareEfficient
from thalweg.encoding import BravyiKitaev
from thalweg.encoding.encoded import encode_fermions
from thalweg.errors import Stopped
from thalweg.exact.determinant import lowest_level
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.study.problem import make_engine, prepare
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain
from thalweg.watch import Watch


class Looks:
    """Counts how often work asks whether to stop, and says yes at one of the times."""

    def __init__(self, stop_at: int = 0) -> None:
        self.count, self._stop_at = 0, stop_at
        self.watch = Watch(should_stop=self)

    def __call__(self) -> bool:
        self.count += 1
        return self.count == self._stop_at


@pytest.fixture(scope="module")
def nitrogen():
    system = Molecule(atoms=(("N", 0.0, 0.0, 0.0), ("N", 0.0, 0.0, 1.1)))
    hamiltonian = system.prepare().fermions
    return lambda watch: lowest_level(hamiltonian, watch=watch, budget_bytes=2**30)


@pytest.fixture(scope="module")
def gradient():
    engine = make_engine(prepare(StudySpec(system=LatticeModel(lattice=Chain(sites=20)), ansatz=HardwareEfficient(depth=2))))
    parameters = np.full(engine.n_parameters, 0.1)

    def work(watch):
        engine.watch = watch
        engine.energy_and_gradient(parameters)

    return work


@pytest.fixture(scope="module")
def mapping():
    m, rng = 20, np.random.default_rng(1)
    h, g = rng.normal(size=(m, m)), rng.normal(size=(m,) * 4)
    for order in ((1, 0, 2, 3), (0, 1, 3, 2), (2, 3, 0, 1)):
        g = g + g.transpose(order)
    hamiltonian = FermionHamiltonian(0.0, h + h.T, g, np.zeros(m, np.int64), Sector(m, 3, 3), (7, 7), np.empty(0))
    return lambda watch: encode_fermions(hamiltonian, BravyiKitaev(), watch)


@pytest.mark.parametrize(("work", "least"), [("nitrogen", 40), ("gradient", 16), ("mapping", 5)])
def test_long_work_looks_often_and_stops_wherever_it_is_asked_to(request, work, least):
    run = request.getfixturevalue(work)
    whole = Looks()
    run(whole.watch)
    assert whole.count >= least
    for place in np.linspace(1, whole.count, 5).astype(int):
        looks = Looks(stop_at=int(place))
        with pytest.raises(Stopped):
            run(looks.watch)
        assert looks.count == place  # nothing goes on behind a stop
