"""The Convergence picture as data: energy and error against iteration, evaluations, circuits, shots or seconds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np

from thalweg.ansatz import Adaptive
from thalweg.arrays import FloatArray
from thalweg.study.result import GrowthStep, StudyResult, Trace
from thalweg.units import CHEMICAL_ACCURACY
from thalweg_app.presenters import wording
from thalweg_app.presenters.chart import Band, Chart, Level, Panel, Role, Series, column
from thalweg_app.presenters.live import LiveRun
from thalweg_app.presenters.tables import Table

XChoice = Literal["iteration", "evaluations", "circuits", "shots", "seconds"]
X_TITLES: dict[XChoice, str] = {
    "iteration": "Iteration",
    "evaluations": "Energy evaluations",
    "circuits": "Circuits run",
    "shots": "Shots",
    "seconds": "Seconds",
}
CLASSICAL_NAMES = {"mp2": "MP2", "ccsd": "CCSD", "ccsd(t)": "CCSD(T)"}
#: Height of the energy panel as a multiple of the error panel's.
ENERGY_SHARE = 1.15
EMPTY = "Press Run to see the energy fall towards the exact one."


class Columns(Protocol):
    """What `Trace` and `LiveStart` have in common."""

    @property
    def iteration(self) -> Sequence[int]: ...
    @property
    def energy(self) -> Sequence[float]: ...
    @property
    def gradient_norm(self) -> Sequence[float | None]: ...
    @property
    def standard_error(self) -> Sequence[float | None]: ...
    @property
    def noiseless(self) -> Sequence[float | None]: ...


@dataclass(frozen=True)
class Shown:
    """One run in the picture, finished or under way."""

    name: str
    unit: str
    reference_name: str
    reference_energy: float
    exact_energy: float | None
    target: float
    starts: tuple[Columns, ...]
    best_start: int
    classical: dict[str, float | None]
    steps: tuple[GrowthStep, ...] = ()

    @property
    def lead(self) -> Columns:
        return self.starts[self.best_start]


def shown_result(number: int, result: StudyResult) -> Shown:
    starts: tuple[Columns, ...] = tuple(s.trace for s in result.starts) or (Trace(),)
    return Shown(
        f"Run {number}",
        result.energy_unit,
        result.reference_name,
        result.reference_energy,
        result.exact_energy,
        result.target_error,
        starts,
        result.best_start,
        result.classical,
        result.growth,
    )


def shown_live(live: LiveRun) -> Shown | None:
    """None before the first iterate."""
    lead = live.lead
    if live.started is None or lead is None:
        return None
    s = live.started
    name = "Running" if live.check_of is None else f"Check of run {live.check_of}"
    return Shown(name, s.energy_unit, s.reference_name, s.reference_energy, s.exact_energy, s.target_error, tuple(live.starts), lead, {})


def convergence(main: Shown | None, overlays: Sequence[Shown] = (), x: XChoice = "iteration", difference_unit: str = "mEh") -> Chart:
    """Energies of the main run with its levels; errors of the main run and of every overlay of the same unit."""
    if main is None:
        return Chart("Convergence", X_TITLES[x], (), EMPTY)
    factor, unit = wording.difference_factor(main.unit, difference_unit)
    others = [o for o in overlays if o.unit == main.unit]
    energy = Panel(
        f"Energy / {wording.unit_name(main.unit)}",
        (*_curves(main, others, x, lambda run, start: column(start.energy), bars=True), *_steps(main, x)),
        _levels(main),
        share=ENERGY_SHARE,
    )
    return Chart("Convergence", X_TITLES[x], (energy, _lower(main, others, x, factor, unit)), EMPTY, _describe(main))


def _lower(main: Shown, others: list[Shown], x: XChoice, factor: float, unit: str) -> Panel:
    if main.exact_energy is None:
        curves = _curves(main, others, x, lambda run, start: _positive(column(start.gradient_norm)))
        return Panel("Largest gradient component", curves, log=True)

    def error(run: Shown, start: Columns) -> FloatArray:
        """Of the simulated state, as a measured error may well be negative."""
        exact = np.nan if run.exact_energy is None else run.exact_energy
        noiseless = [e if n is None else n for e, n in zip(start.energy, start.noiseless, strict=False)] or start.energy
        return _positive((column(noiseless) - exact) * factor)

    band = Band(main.target * factor, f"{_target_name(main)}, {wording.significant(main.target * factor)} {unit}")
    return Panel(f"Error against exact / {unit}", _curves(main, others, x, error), band=band, log=True)


def _curves(main: Shown, others: list[Shown], x: XChoice, values: object, *, bars: bool = False) -> tuple[Series, ...]:
    assert callable(values)
    curves = []
    for k, start in enumerate(main.starts):
        if k != main.best_start:
            curves.append(_series(f"{main.name}, start {k + 1}", start, x, values(main, start), "faint", k, bars=False))
    for rank, other in enumerate(others):
        curves.append(_series(other.name, other.lead, x, values(other, other.lead), "overlay", rank, bars=bars))
    curves.append(_series(main.name, main.lead, x, values(main, main.lead), "variational", 0, bars=bars))
    return tuple(curves)


def _series(name: str, start: Columns, x: XChoice, y: FloatArray, role: Role, rank: int, *, bars: bool) -> Series:
    along = np.asarray(getattr(start, x), dtype=np.float64)
    n = min(along.size, y.size)
    spread = 2 * column(start.standard_error)[:n] if bars and any(e is not None for e in start.standard_error) else None
    return Series(name, along[:n], y[:n], role, rank, legend=role != "faint", spread=spread)


def _steps(main: Shown, x: XChoice) -> tuple[Series, ...]:
    """Where a trial state grew: the ends of its steps, as marks on the curve of energies."""
    along = np.asarray(getattr(main.lead, x), dtype=np.float64)
    iterations = np.asarray(main.lead.iteration)
    ends = [(int(np.searchsorted(iterations, step.iteration)), step.energy) for step in main.steps]
    kept = [(along[i], energy) for i, energy in ends if i < along.size]
    if not kept:
        return ()
    places, energies = (np.array(column, dtype=np.float64) for column in zip(*kept, strict=True))
    return (Series("Steps of growth", places, energies, "overlay", 2, line=False),)


def growth_table(result: StudyResult | None, difference_unit: str = "mEh") -> Table:
    """One row a step of growth or of a depth ladder; empty where the trial state did not grow."""
    if result is None or not result.growth:
        return Table((), (), (), ())
    _, unit = wording.difference_factor(result.energy_unit, difference_unit)
    rows: list[tuple[str, ...]] = []
    keys: list[tuple[float | str, ...]] = []
    for number, step in enumerate(result.growth):
        added = _added(result, number)
        error = wording.difference(step.error, result.energy_unit, difference_unit)
        rows.append((str(number), added, wording.count(step.parameters), wording.count(step.two_qubit_gates), wording.energy(step.energy), error))
        keys.append(
            (float(number), added, step.parameters, float(step.two_qubit_gates or 0), step.energy, np.inf if step.error is None else step.error)
        )
    header = ("Step", "Added", "Parameters", "Two-qubit gates", f"Energy / {wording.unit_name(result.energy_unit)}", f"Error / {unit}")
    return Table(header, tuple(rows), (True, False, True, True, True, True), tuple(keys), "What each step added, and the energy after it.")


def _added(result: StudyResult, number: int) -> str:
    """What a step appended. Growth begins with the reference, or with all that another run had grown."""
    added = result.growth[number].added
    if number == 0 and added and isinstance(result.spec.ansatz, Adaptive):
        return f"{wording.counted(len(added), 'operator')} of {result.spec.neighbour.source or 'another run'}"
    return "; ".join(added) or result.reference_name


def _levels(main: Shown) -> tuple[Level, ...]:
    levels = [Level(main.reference_name, main.reference_energy, "reference")]
    for rank, (key, value) in enumerate(main.classical.items()):
        if value is not None:
            levels.append(Level(CLASSICAL_NAMES.get(key, key), value, "classical", rank))
    if main.exact_energy is not None:
        levels.append(Level("Exact", main.exact_energy, "exact"))
    return tuple(levels)


def _target_name(main: Shown) -> str:
    chemical = main.unit == "hartree" and abs(main.target - CHEMICAL_ACCURACY) < 1e-9
    return "Chemical accuracy" if chemical else "Target"


def _describe(main: Shown) -> str:
    energies = main.lead.energy
    if not energies:
        return main.name
    unit = wording.unit_name(main.unit)
    last = f"{main.name}: energy {energies[-1]:.6f} {unit} after {len(energies) - 1} iterations"
    return last if main.exact_energy is None else f"{last}, exact {main.exact_energy:.6f} {unit}"


def _positive(values: FloatArray) -> FloatArray:
    return np.where(values > 0, values, np.nan)
