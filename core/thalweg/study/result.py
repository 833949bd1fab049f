"""The result of one run: every number, and everything needed to judge and repeat it."""

from __future__ import annotations

from typing import Any

from pydantic import BaseModel, ConfigDict

from thalweg.errors import StudyError
from thalweg.study.spec import Neighbour, StudySpec

#: Why a minimisation ended -> the sentence shown.
STOP_REASONS: dict[str, str] = {
    "gradient": "the largest gradient component fell below the limit",
    "energy-change": "the energy no longer fell",
    "converged": "the optimiser's own convergence test was met",
    "target": "the target accuracy was reached",
    "iterations": "the iteration limit was reached",
    "evaluations": "the evaluation limit was reached",
    "seconds": "the time limit was reached",
    "shots": "the shot limit was reached",
    "line-search": "the line search found no lower point",
    "stopped-by-person": "stopped by hand; the best point so far is kept",
    "cut-off": "the calculation was cut off; the lowest energy so far is kept",
    "no-parameters": "the trial state has no parameters",
    "pool-slope": "no operator of the pool has a slope above the limit",
    "slope-noise": "no slope of the pool stands out of its statistical error",
    "operators": "the limit on the number of operators was reached",
    "no-gain": "one layer more no longer lowered the energy",
    "not-finite": "the energy became infinite or not a number",
}
#: Reasons that count as an end of the search, as against an interruption.
CONVERGED = frozenset({"gradient", "energy-change", "converged", "target", "no-parameters", "pool-slope", "no-gain"})


class Record(BaseModel):
    """Validators are built at their first use: no start of the program needs them."""

    model_config = ConfigDict(frozen=True, defer_build=True, ser_json_inf_nan="constants")  # never silently null


class Trace(Record):
    """The iterates of one start, columns of equal length; the last four are empty in results from before they were counted.

    Attributes:
        energy: measured where the optimiser measured it, otherwise that of the simulation.
        gradient_norm: None where no gradient was worked out.
        circuits, shots: totals so far, as a device would count them.
        standard_error: of a measured energy; None where the energy is exact.
        noiseless: the energy of the simulation beside sampled ones; None where `energy` is exact by itself.
    """

    iteration: tuple[int, ...] = ()
    evaluations: tuple[int, ...] = ()
    energy: tuple[float, ...] = ()
    gradient_norm: tuple[float | None, ...] = ()
    seconds: tuple[float, ...] = ()
    circuits: tuple[int, ...] = ()
    shots: tuple[int, ...] = ()
    standard_error: tuple[float | None, ...] = ()
    noiseless: tuple[float | None, ...] = ()


class StartRecord(Record):
    """One start of the minimisation. A sampled energy is measured afresh at the end, so that no choice has favoured it."""

    seed: int
    energy: float
    stop_reason: str
    evaluations: int
    iterations: int
    gradient_norm: float | None
    seconds: float
    trace: Trace
    circuits: int = 0
    shots: int = 0
    standard_error: float | None = None


class LeadingWeight(Record):
    label: str
    weight: float
    exact_weight: float | None


class BestString(Record):
    """For a diagonal cost: the best of the bit strings that measurements of the trial state would show."""

    bits: str  # site 0 first
    energy: float
    weight: float  # probability to measure it
    words: str = ""  # what it means, such as the two parts of a cut


class SiteFigures(Record):
    """A state on its lattice; empty where a figure has no meaning. Spins in units of hbar; sites in order.

    Attributes:
        magnetisation: <S^z_i>.
        z_correlations, spin_correlations: <S^z_i S^z_j> and <S_i.S_j>, one row a site.
        structure_factor: (k_x, k_y, S(k)), momenta in units of 1 / nearest distance.
        double_occupancy: <n_i,up n_i,down> of electrons.
    """

    magnetisation: tuple[float, ...] = ()
    z_correlations: tuple[tuple[float, ...], ...] = ()
    spin_correlations: tuple[tuple[float, ...], ...] = ()
    structure_factor: tuple[tuple[float, float, float], ...] = ()
    double_occupancy: tuple[float, ...] = ()


class GrowthStep(Record):
    """One step of adaptive growth or of a depth ladder, after its minimisation. The first is the reference, what another run had grown, or
    the shallowest circuit."""

    added: tuple[str, ...]  # what this step appended, or began with: operators, or the depth in words; empty for the reference
    parameters: int
    two_qubit_gates: int | None
    energy: float
    error: float | None
    largest_slope: float | None  # among the operators of the pool, after this step, as they were measured; None without a pool
    iteration: int  # iterations and evaluations of the whole start when the step ended
    evaluations: int
    standard_error: float | None = None  # of a sampled energy, or the one that shots would have


class StudyResult(Record):
    """All energies in `energy_unit`, core energy included. None: the figure does not exist for this study.

    `energy` and everything drawn from it is that of the simulated state, without noise; `measured_energy` with its
    `standard_error` is what the shots gave. With exact evaluation `standard_error`, where there is one, is what shots would have.

    `seconds` are those of all starts added up, so that runs can be compared; `elapsed` is the time by the clock of the whole search where
    starts ran side by side, None where they ran one after another.
    """

    label: str
    energy_unit: str
    energy: float
    exact_energy: float | None
    reference_name: str
    reference_energy: float
    error: float | None
    target_error: float
    reached_target: bool
    verdict: str
    verdict_kind: str  # reached | outside | stationary | wrong-symmetry | not-converged | uncertain | no-exact
    remarks: tuple[str, ...] = ()
    classical: dict[str, float | None] = {}

    qubits: int
    qubits_before_tapering: int
    terms: int
    one_norm: float
    largest_weight: int
    parameters: int
    two_qubit_gates: int | None = None
    sector_dimension: int | None = None

    measured_energy: float | None = None
    standard_error: float | None = None

    evaluations: int
    circuits: int = 0
    shots: int = 0
    iterations: int
    seconds: float
    elapsed: float | None = None
    preparation_seconds: float
    stop_reason: str
    gradient_norm: float | None
    starts: tuple[StartRecord, ...] = ()
    best_start: int = 0
    growth: tuple[GrowthStep, ...] = ()  # of the best start

    n_electrons: float | None = None
    s_z: float | None = None
    s_squared: float | None = None
    variance: float | None = None
    fidelity: float | None = None
    exact_degeneracy: int | None = None
    exact_gap: float | None = None
    exact_s_squared: float | None = None
    exact_method: str = ""
    leading: tuple[LeadingWeight, ...] = ()
    best_string: BestString | None = None
    natural_occupations: tuple[float, ...] = ()
    sites: SiteFigures | None = None
    exact_sites: SiteFigures | None = None  # averaged over the ground space

    final_parameters: tuple[float, ...] = ()
    start_parameters: tuple[float, ...] = ()
    parameter_labels: tuple[str, ...] = ()
    operator_order: str = ""
    pauli_terms: tuple[tuple[str, float], ...] = ()  # the heaviest, for the Hamiltonian picture

    system_facts: dict[str, Any] = {}
    seed: int
    versions: dict[str, str]
    constants: dict[str, float | str]
    spec: StudySpec

    def as_start(self, name: str) -> Neighbour:
        """The final parameters as a start of another search; `name` is what this run is called, as in `run 3`. StudyError where it has none."""
        if not self.final_parameters:
            what = f"{name[:1].upper()}{name[1:]} has no parameters to start from"
            why = "it was cut off before it handed any over" if self.parameters else "its trial state has none"
            raise StudyError(what, why, "Take another run", "neighbour")
        source = f"{name}, {self.label}, {self.spec.ansatz.title}"
        return Neighbour(parameters=self.final_parameters, labels=self.parameter_labels, source=source)

    @property
    def trace(self) -> Trace:
        """The iterates of the start that gave the answer."""
        return self.starts[self.best_start].trace if self.starts else Trace()
