"""What to look at when a search fails: settings of a diagnosis."""

from __future__ import annotations

from typing import Annotated, ClassVar, Literal

from pydantic import Field

from thalweg.options import Options, option
from thalweg.study.spec import StudySpec

Cost = Literal["energy", "global", "local"]
Component = Literal["mean", "first", "last"]
Starts = Literal["uniform", "as-set"]


class Trainability(Options):
    """Variance of the gradient over random starts, for growing registers and depths."""

    title: ClassVar[str] = "Trainability"
    about: ClassVar[str] = "How fast gradients vanish with qubits and layers (McClean et al. 2018; Cerezo et al. 2021)."

    key: Literal["trainability"] = "trainability"
    study: StudySpec
    cost: Cost = option(
        "energy",
        "Cost",
        "The energy of the study; or of |0...0>: one minus its probability (global), one minus the mean probability of 0 on a qubit (local).",
    )
    qubits: tuple[int, ...] = option((), "Sizes", "Sites of the lattice, or qubits of a global or local cost; empty: as the study is.")
    layers: tuple[int, ...] = option((), "Layers", "Depths of the trial state; empty: as it is set.")
    samples: int = option(200, "Samples", "Random starts of each point.", ge=8, le=1_000_000)
    component: Component = option("mean", "Component", "The mean over all components of the gradient, or the first or the last of them.")
    starts: Starts = option("uniform", "Starts", "Angles uniform over the whole circle, or the start of the trial state as it is set.")


class Direction(Options):
    """A direction in parameter space."""

    kind: Literal["parameter", "random", "steepest", "point"] = option(
        "random", "Direction", "Along one parameter, a random direction, the steepest descent at the centre, or towards another point."
    )
    parameter: int = option(0, "Parameter", "Number of the parameter, from 0.", ge=0)
    point: tuple[float, ...] = option((), "Point", "Parameters of the other point, which lies at 1.")
    labels: tuple[str, ...] = option((), "Labels", "The label of each of them; empty: those of the centre.")


class Landscape(Options):
    """The energy along one or two directions through a point."""

    title: ClassVar[str] = "Landscape"
    about: ClassVar[str] = "Energies along directions through a point: how steep, how rugged, what lies between two results."

    key: Literal["landscape"] = "landscape"
    study: StudySpec
    centre: tuple[float, ...] = option((), "Centre", "Parameters of the point; empty: the start of the trial state.")
    labels: tuple[str, ...] = option((), "Labels", "The label of each of them, from which a grown trial state is built; empty: as they are numbered.")
    directions: tuple[Direction, ...] = option((Direction(),), "Directions", "One for a curve, two for a map.", min_length=1, max_length=2)
    reach: float = option(3.141592653589793, "Reach", "How far to go on both sides.", unit="rad", gt=0)
    points: int = option(41, "Points", "Energies along each direction.", ge=3, le=1001)


AnyDiagnosis = Annotated[Trainability | Landscape, Field(discriminator="key")]
