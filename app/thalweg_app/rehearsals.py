"""Small studies that together run the kernels which most studies need, so that these are compiled before a person waits for them.

`python -m thalweg_app.rehearsals` compiles what a molecule needs; the window's worker does the rest while nobody waits.
"""

from __future__ import annotations

import contextlib
import hashlib
import os
import platform
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

from thalweg_app.compiled import VARIABLE

if TYPE_CHECKING:
    from thalweg.study.spec import StudySpec
    from thalweg.systems import Molecule


def rehearse() -> None:
    """Loads compiled code by the smallest study; runs all rehearsals where this machine has not yet."""
    specs = rehearsals()
    run_quietly(next(specs))
    mark = finished_mark()
    if mark is None or mark.exists():
        return
    for spec in specs:
        run_quietly(spec)
    with contextlib.suppress(OSError):
        mark.touch()


def is_rehearsed() -> bool:
    """Whether every rehearsal was compiled for this processor."""
    mark = finished_mark()
    return mark is not None and mark.exists()


def run_quietly(spec: StudySpec) -> None:
    """A library that is missing is reported by the job that needs it."""
    from thalweg.errors import StudyError
    from thalweg.study.run import run

    with contextlib.suppress(StudyError, ImportError):
        run(spec)


def rehearsals() -> Iterator[StudySpec]:
    """The likeliest first: a molecule, then what only larger molecules, circuits on a register and lattices need."""
    from thalweg.ansatz import AlternatingOperators, HardwareEfficient
    from thalweg.evaluate import Shots
    from thalweg.optimize import SPSA
    from thalweg.optimize.objective import StopRules
    from thalweg.study.spec import StudySpec
    from thalweg.systems import LatticeModel, Molecule
    from thalweg.systems.lattice import Chain

    few = StopRules(evaluations=3)
    yield StudySpec(system=chain_of_hydrogen(2), stop=few)
    yield StudySpec(system=chain_of_hydrogen(8), stop=few)
    yield StudySpec(system=chain_of_hydrogen(10), exact=False, stop=few)
    yield StudySpec(system=chain_of_hydrogen(2), ansatz=HardwareEfficient(), stop=few)
    yield StudySpec(system=LatticeModel(lattice=Chain(sites=16)), ansatz=AlternatingOperators(), stop=few)
    yield StudySpec(system=Molecule(atoms=HYDRIDE), ansatz=HardwareEfficient(depth=1), optimizer=SPSA(), evaluation=Shots(), stop=few)


def chain_of_hydrogen(atoms: int) -> Molecule:
    from thalweg.systems import Molecule

    return Molecule(atoms=tuple(("H", 0.0, 0.0, 0.9 * i) for i in range(atoms)))


HYDRIDE = (("Li", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.6))


def finished_mark() -> Path | None:
    """The file whose presence says that all rehearsals were compiled for this processor; None where compiled code is not kept by us."""
    folder = os.environ.get(VARIABLE, "")
    if not folder:
        return None
    import llvmlite.binding
    import numba

    machine = "|".join((platform.python_version(), numba.__version__, llvmlite.binding.get_host_cpu_name()))
    return Path(folder) / f"rehearsed-{hashlib.sha256(machine.encode()).hexdigest()[:12]}"


if __name__ == "__main__":
    from thalweg_app.compiled import keep_compiled
    from thalweg_app.threads import cap_threads

    cap_threads()
    keep_compiled()
    run_quietly(next(rehearsals()))
