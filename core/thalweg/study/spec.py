"""The study as data: everything a person chooses, and nothing that is computed.

Scalars, strings and tuples only, so that two specs can be compared and hashed, and a session holds them as they are.
"""

from __future__ import annotations

import json
from typing import Annotated, Any, Literal

from pydantic import Field, ValidationError, field_validator, model_validator

from thalweg.ansatz import (
    ANSATZE,
    PUCCD,
    UCCD,
    UCCGSD,
    UCCSD,
    Adaptive,
    AlternatingOperators,
    ExchangeLayers,
    HardwareEfficient,
    KUpCCGSD,
    NumberConserving,
)
from thalweg.encoding import ENCODINGS, BravyiKitaev, JordanWigner, ParityEncoding
from thalweg.errors import StudyError
from thalweg.evaluate import EVALUATIONS, Exact, ExactWithError, Shots
from thalweg.optimize import (
    COBYLA,
    GCANS,
    ICANS,
    LBFGSB,
    OPTIMIZERS,
    SLSQP,
    SPSA,
    Adam,
    ConjugateGradient,
    FreeAxis,
    GradientDescent,
    ImaginaryTime,
    Momentum,
    NaturalGradient,
    NelderMead,
    Nesterov,
    OperatorSampling,
    SequentialMinimal,
)
from thalweg.optimize.objective import StopRules
from thalweg.options import Options, option
from thalweg.registry import Alternatives
from thalweg.systems import SYSTEMS, Integrals, LatticeModel, Molecule, has_electrons
from thalweg.systems.lattice import LATTICES
from thalweg.systems.lattice_model import MODELS
from thalweg.units import CHEMICAL_ACCURACY

AnySystem = Annotated[Molecule | Integrals | LatticeModel, Field(discriminator="key")]
AnyEncoding = Annotated[JordanWigner | ParityEncoding | BravyiKitaev, Field(discriminator="key")]
AnyAnsatz = Annotated[
    UCCSD | UCCD | UCCGSD | PUCCD | KUpCCGSD | Adaptive | NumberConserving | HardwareEfficient | AlternatingOperators | ExchangeLayers,
    Field(discriminator="key"),
]
AnyOptimizer = Annotated[
    LBFGSB
    | SLSQP
    | ConjugateGradient
    | COBYLA
    | NelderMead
    | SPSA
    | SequentialMinimal
    | FreeAxis
    | GradientDescent
    | Momentum
    | Nesterov
    | Adam
    | NaturalGradient
    | ImaginaryTime
    | ICANS
    | GCANS
    | OperatorSampling,
    Field(discriminator="key"),
]

AnyEvaluation = Annotated[Exact | Shots | ExactWithError, Field(discriminator="key")]

ClassicalMethod = Literal["mp2", "ccsd", "ccsd(t)"]


class Target(Options):
    """What counts as accurate enough."""

    error: float = option(
        CHEMICAL_ACCURACY,
        "Target error",
        "Largest error against exact that counts as reached for molecules; 1 kcal/mol by default.",
        unit="Eh",
        gt=0,
    )
    relative: float = option(
        1e-3,
        "Relative target",
        "Largest error that counts as reached for lattice models, as a part of |E|.",
        gt=0,
        lt=1,
    )

    def error_in(self, energy_unit: str, energy: float) -> float:
        """The largest error that counts as reached, in `energy_unit`; `energy` is the exact one, or the reference where there is none."""
        return self.error if energy_unit == "hartree" else self.relative * abs(energy)


class DepthLadder(Options):
    """A layered trial state with 1, 2, 3 ... layers up to its own setting, each searched from the best of the last."""

    on: bool = option(False, "Depth ladder", "Run 1, 2, 3 ... layers up to the depth of the trial state, each from the best of the last.")
    least_gain: float = option(1e-6, "Least gain", "Stop climbing when one layer more lowers the energy by less.", unit="Eh", ge=0, advanced=True)


class Neighbour(Options):
    """Another run at whose final parameters a search begins; empty: none.

    The numbers themselves, so that the study runs again without the ledger that they came from. A label may repeat, because a
    growing trial state takes an operator as often as it helps.
    """

    parameters: tuple[float, ...] = option((), "Parameters", "Final parameters of the other run.", unit="rad")
    labels: tuple[str, ...] = option((), "Labels", "The label of each, by which parameters find their place.")
    source: str = option("", "Source", "Which run that was, as in `run 3, LiH, STO-3G, UCCSD`.")

    @property
    def is_given(self) -> bool:
        return bool(self.parameters)

    @model_validator(mode="after")
    def _every_parameter_has_a_label(self) -> Neighbour:
        if len(self.parameters) != len(self.labels):
            raise StudyError(
                f"The start has {len(self.parameters)} parameters and {len(self.labels)} labels",
                "a parameter finds its place by its label",
                "Give one label for each parameter",
                "neighbour",
            )
        return self


REFERENCE_HELP = (
    "Empty: that of the system, such as the Hartree-Fock determinant. Otherwise the occupation of each active orbital, as in `22ab00` "
    "(2 pair, a or b one electron, 0 empty), or one bit for each spin orbital or site. A combination is a sum, as in `0.9*2200 - 0.4*2020`, "
    "or a list, as in `2200, 2020`: the lowest state among those listed. Excitations count from the first."
)
CONTINUATION_HELP = (
    "Come to the full Hamiltonian in this many steps from the mean-field one (for spins from the terms that the reference minimises), each "
    "searched from the last; 0 begins at the full one. For trial states that do not grow."
)


class StudySpec(Options):
    """One study. The union members are told apart by their `key`."""

    system: AnySystem
    encoding: AnyEncoding = JordanWigner()
    ansatz: AnyAnsatz = UCCSD()
    optimizer: AnyOptimizer = LBFGSB()
    evaluation: AnyEvaluation = Exact()
    stop: StopRules = StopRules()
    target: Target = Target()
    ladder: DepthLadder = DepthLadder()
    neighbour: Neighbour = option(Neighbour(), "Neighbour", "Another run at whose final parameters the search begins.")
    reference: str = option("", "Reference", REFERENCE_HELP, advanced=True)
    continuation: int = option(0, "Continuation steps", CONTINUATION_HELP, ge=0, le=1000, advanced=True)
    classical: tuple[ClassicalMethod, ...] = option((), "Classical methods", "Reference figures to compute beside the exact one.")
    exact: bool = option(True, "Exact energy", "Diagonalise the Hamiltonian in its sector beside the minimisation.")
    exact_spin: Literal["any", "fixed"] = option(
        "any",
        "Spin of the exact state",
        "`any` takes the lowest state of the sector, `fixed` the lowest of the multiplicity asked for (electrons only).",
    )
    starts: int = option(1, "Starts", "Number of independent starts; the lowest counts.", ge=1, le=1000)
    seed: int = option(1, "Seed", "Seed of every random choice.", ge=0, le=2**31 - 1)
    memory_gib: float = option(4.0, "Memory budget", "Refuse work that would need more memory than this.", unit="GiB", gt=0, advanced=True)

    @field_validator("reference", mode="before")
    @classmethod
    def _digits_are_text(cls, value: Any) -> Any:
        """`2200` on a command line or in a hand-written file is read as a number before it gets here."""
        return str(value) if isinstance(value, int | float) and not isinstance(value, bool) else value


#: Section of the spec -> its alternatives, for forms, the terminal and contract tests.
SECTIONS: dict[str, Alternatives[Any]] = {
    "system": SYSTEMS,
    "encoding": ENCODINGS,
    "ansatz": ANSATZE,
    "optimizer": OPTIMIZERS,
    "evaluation": EVALUATIONS,
}
#: Every field of the spec, at any depth, that holds one of several alternatives.
UNIONS: dict[str, Alternatives[Any]] = SECTIONS | {"lattice": LATTICES, "model": MODELS}


#: Trial state of a spin model until another is chosen.
SPIN_ANSATZ = AlternatingOperators


def suited(spec: StudySpec) -> StudySpec:
    """The same study, with the usual trial state of spins where its own needs electrons and the system has none."""
    if has_electrons(spec.system) or not getattr(spec.ansatz, "electrons_only", False):
        return spec
    return spec.model_copy(update={"ansatz": SPIN_ANSATZ()})


def with_setting(spec: StudySpec, path: str, value: Any) -> StudySpec:
    """A copy with one field changed. `path` is dotted, e.g. `optimizer.max_iterations`; strings are read as JSON where they parse.

    Setting a section or a union within one to a key (`ansatz` = `hardware-efficient`, `system.lattice` = `kagome`) switches the
    alternative and takes its defaults.
    """
    data = spec.model_dump()
    if isinstance(value, str):
        value = _read(value)
    *parents, last = path.split(".")
    node: Any = data
    for name in parents:
        if not isinstance(node, dict) or name not in node:
            raise StudyError(f"Unknown setting '{path}'", f"there is no '{name}'", f"Use one of: {_names(node)}", path)
        node = node[name]
    if not isinstance(node, dict) or (last not in node and not parents):
        raise StudyError(f"Unknown setting '{path}'", "no such field", f"Use one of: {_names(node)}", path)
    if last in UNIONS and isinstance(value, str) and isinstance(node[last], dict):
        value = {"key": UNIONS[last].get(value).model_fields["key"].default} if value != node[last]["key"] else node[last]
    node[last] = value
    return spec_from_data(data)


def spec_from_data(data: dict[str, Any]) -> StudySpec:
    """Validates plain data; StudyError naming the first field at fault."""
    try:
        return StudySpec.model_validate(data)
    except ValidationError as error:
        raise study_error(error) from None


def study_error(error: ValidationError) -> StudyError:
    """The first validation message as what, why, how to mend."""
    first = error.errors()[0]
    field = _path(first["loc"])
    cause = first.get("ctx", {}).get("error")
    if isinstance(cause, StudyError):
        return StudyError(cause.what, cause.why, cause.fix, field)
    given = repr(first.get("input"))
    why = first["msg"][:1].lower() + first["msg"][1:]
    return StudyError(f"Setting '{field}' cannot be {given[:60]}", why, "Give a value that fits", field)


def _path(location: tuple[int | str, ...]) -> str:
    """Dotted path of a field; the keys by which pydantic names the member of a union are left out."""
    parts: list[str] = []
    members: list[str] = []
    for part in map(str, location):
        if part in members:
            members = []
            continue
        parts.append(part)
        members = UNIONS[part].keys() if part in UNIONS else []
    return ".".join(parts)


def _read(text: str) -> Any:
    try:
        return json.loads(text)
    except ValueError:
        return {"true": True, "yes": True, "on": True, "false": False, "no": False, "off": False}.get(text.lower(), text)


def _names(node: Any) -> str:
    return ", ".join(node) if isinstance(node, dict) else "a field of the study"
