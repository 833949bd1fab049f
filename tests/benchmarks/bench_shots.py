"""Bar B15: shots that a search needs for one error, shot-frugal methods against Adam with a fixed number of shots, over 20 seeds.

Not a matter of seconds, so that the figures do not depend on the machine.
"""

from __future__ import annotations

import numpy as np

from thalweg.ansatz import UCCSD
from thalweg.evaluate import Shots
from thalweg.optimize import GCANS, ICANS, Adam, OperatorSampling, OptimizerSettings
from thalweg.optimize.objective import StopRules
from thalweg.study.events import AnyEvent, Iteration
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule
from thalweg.units import CHEMICAL_ACCURACY

Row = dict[str, object]
SEEDS = range(1, 21)
#: So many iterates in a row must lie within the error; the shots of the first of them count.
IN_A_ROW = 5
#: Hydrogen at 0.7414 angstrom, STO-3G; every excitation of the spin orbitals, so that the search has directions that lead nowhere.
BASE = StudySpec(
    system=Molecule(name="H2", atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.7414))),
    ansatz=UCCSD(point_group=False, start="uniform-random"),
    stop=StopRules(evaluations=0, shots=3_000_000),
)
#: Error -> the fixed numbers of shots tried with Adam, of which the best counts, and by how much the frugal methods must beat it.
ERRORS = {CHEMICAL_ACCURACY: ((30, 100, 300), 1.2), CHEMICAL_ACCURACY / 5: ((100, 300, 1000), 1.2)}
MOST_ITERATIONS = 600
FRUGAL: dict[str, OptimizerSettings] = {
    "iCANS": ICANS(memory=0.9, max_iterations=MOST_ITERATIONS),
    "gCANS": GCANS(memory=0.9, max_iterations=MOST_ITERATIONS),
    "random operator sampling": OperatorSampling(memory=0.9, max_iterations=MOST_ITERATIONS),
}


def b15_frugal_shots() -> list[Row]:
    """H2, to one error: median shots of Adam / median shots of each frugal method."""
    rows: list[Row] = []
    for error, (tried, limit) in ERRORS.items():
        adam = Adam(step=0.05, max_iterations=MOST_ITERATIONS)
        best, name = min((median(adam, shots, error), f"Adam with {shots} shots an energy") for shots in tried)
        for title, optimizer in FRUGAL.items():
            frugal = median(optimizer, 1000, error)
            what = f"{name} {best:,.0f} / {title} {frugal:,.0f} shots to {error * 1e3:.2g} mEh"
            text = f"H2 under shots, medians of {len(SEEDS)} seeds: {what}, at least"
            rows.append({"bar": "B15", "text": text, "measured": best / frugal, "limit": limit, "met": best / frugal >= limit})
    return rows


def median(optimizer: OptimizerSettings, shots: int, error: float) -> float:
    return float(np.median([shots_needed(optimizer, shots, error, seed) for seed in SEEDS]))


def shots_needed(optimizer: OptimizerSettings, shots: int, error: float, seed: int) -> float:
    """Shots up to the first of IN_A_ROW iterates whose noiseless energy is within the error; infinite where there are none."""
    spec = BASE.model_copy(update={"optimizer": optimizer, "evaluation": Shots(shots=shots), "seed": seed})
    reached: list[int] = []
    exact = -1.1372701746609035  # full configuration interaction, as in tests/reference/molecular_energies.py to 1e-7

    def watch(event: AnyEvent) -> None:
        if isinstance(event, Iteration) and len(reached) < IN_A_ROW:
            energy = event.energy if event.noiseless is None else event.noiseless
            if energy <= exact + error:
                reached.append(event.shots)
            else:
                reached.clear()

    run(spec, watch, lambda: len(reached) == IN_A_ROW)
    return float(reached[0]) if len(reached) == IN_A_ROW else float("inf")


BARS = [b15_frugal_shots]
