"""What a diagnosis found: plain records, JSON as they are."""

from __future__ import annotations

from thalweg.study.diagnosis_spec import Landscape, Trainability
from thalweg.study.result import Record


class GradientSpread(Record):
    """The gradient over random starts of one register and depth.

    Attributes:
        layers: None where the trial state has none.
        variance: of the component asked for, or the mean over all, in the square of the cost's unit; with its standard error.
        cost_deviation: standard deviation of the cost itself.
    """

    qubits: int
    layers: int | None
    parameters: int
    samples: int
    variance: float
    variance_error: float
    cost_deviation: float


class Decay(Record):
    """How the variance falls along one axis, fitted to ln variance by weighted least squares.

    Attributes:
        along: `qubit` or `layer`; `other`: what is held, in words, empty where nothing is.
        factor: by which the variance changes a qubit or layer, with its standard error.
        power: exponent of the fitted power law, with its standard error; None where an axis value is 0.
        kind: exponential | power | flat | undecided.
        sentence: the verdict.
    """

    along: str
    other: str
    factor: float
    factor_error: float
    power: float | None
    power_error: float | None
    kind: str
    sentence: str


class TrainabilityResult(Record):
    spec: Trainability
    unit: str
    points: tuple[GradientSpread, ...]
    decays: tuple[Decay, ...]
    verdict: str


class LandscapeResult(Record):
    """Energies on a line or a grid.

    Attributes:
        labels: each direction in words.
        steps: coordinates along each direction, 0 at the centre; radians, or parts of the way to another point.
        energies: rows along the first direction; one column where there is one direction.
        lowest: (row, column) of the lowest energy.
    """

    spec: Landscape
    unit: str
    labels: tuple[str, ...]
    steps: tuple[tuple[float, ...], ...]
    energies: tuple[tuple[float, ...], ...]
    centre: tuple[float, ...]
    centre_energy: float
    exact_energy: float | None
    lowest: tuple[int, int]
    minima: int
    verdict: str


class Curvature(Record):
    """Second derivatives of the energy at a point, lowest first.

    Attributes:
        eigenvalues: of the Hessian, the lowest of them where there are many.
        direction: eigenvector of the lowest.
        kind: minimum | saddle | flat | not-stationary.
    """

    unit: str
    gradient_norm: float
    eigenvalues: tuple[float, ...]
    direction: tuple[float, ...]
    leading_parameter: str
    kind: str
    verdict: str


class StartSpread(Record):
    """Where the starts of one run ended; sampled energies are those measured at the end."""

    starts: int
    lowest: float
    highest: float
    mean: float
    deviation: float
    distinct: int
    within_target: int | None
    verdict: str
