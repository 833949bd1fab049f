"""A scan as data: a study, a path, and the points on it."""

from __future__ import annotations

from typing import Annotated, Literal

import numpy as np
from pydantic import Field, field_validator

from thalweg.errors import StudyError
from thalweg.options import Options, option
from thalweg.study.path import AnglePath, BondPath, BreathePath, DihedralPath, FramesPath, SettingPath, StretchPath
from thalweg.study.spec import StudySpec

AnyPath = Annotated[BondPath | AnglePath | DihedralPath | StretchPath | BreathePath | FramesPath | SettingPath, Field(discriminator="key")]

#: Neighbouring points that are run one after another, each from the last. Fixed, so that a curve does not depend on the number of workers.
BLOCK = 8


class Literature(Options):
    """Values that the person typed, to stand beside the fitted ones; none is ever filled in by the program."""

    r_e: float | None = option(None, "r_e", "Place of the minimum, in the unit of the coordinate.", gt=0)
    d_e: float | None = option(None, "D_e", "Depth of the well, in the energy unit of the curve.", gt=0)
    omega_e: float | None = option(None, "omega_e", "Harmonic frequency.", unit="cm^-1", gt=0)
    omega_e_x_e: float | None = option(None, "omega_e x_e", "Anharmonicity.", unit="cm^-1")
    source: str = option("", "Source", "Where the values were published.")


class ScanSpec(Options):
    """One scan. Everything that its numbers depend on; where it runs is not part of it."""

    study: StudySpec
    path: AnyPath = BondPath()
    points: tuple[float, ...] = option((), "Points", "Values of the coordinate, in its own unit.")
    follow_orbitals: bool = option(True, "Follow orbitals", "Choose the active orbitals of a point by their overlap with its neighbour's.")
    both_directions: bool = option(False, "Both directions", "Run the curve from both ends and keep the lower energy at each point.")
    spin: Literal["any", "fixed"] = option("any", "Spin of the exact state", "`fixed` keeps the exact reference at the multiplicity asked for.")
    literature: Literature = Literature()
    reduced_mass: float = option(0.0, "Reduced mass", "For the frequency; 0 takes the principal isotopes of a diatomic.", unit="u", ge=0)

    @field_validator("points")
    @classmethod
    def _sorted_points(cls, points: tuple[float, ...]) -> tuple[float, ...]:
        """Ascending without repeats: neighbours in the list are neighbours on the curve."""
        return tuple(sorted(set(points)))

    def at(self, value: float) -> StudySpec:
        """The study of one point. StudyError where the path does not fit the system."""
        study = self.study.model_copy(update={"exact_spin": "fixed"}) if self.spin == "fixed" else self.study
        return self.path.at(study, value)


def linear_points(first: float, last: float, count: int) -> tuple[float, ...]:
    """`count` equally spaced values; rounded to 1e-10 so that they read well and compare equal."""
    _check_range(first, last, count)
    return tuple(float(v) for v in np.round(np.linspace(first, last, count), 10))


def geometric_points(first: float, last: float, count: int) -> tuple[float, ...]:
    """`count` values with a constant ratio: dense at the short end."""
    _check_range(first, last, count)
    if first * last <= 0:
        raise StudyError("Geometric spacing cannot cross zero", "the ratio of neighbours is constant", "Use a range on one side of zero", "points")
    return tuple(float(v) for v in np.round(np.geomspace(first, last, count), 10))


def read_points(text: str) -> tuple[float, ...]:
    """Values from `0.6, 0.7 0.8`; StudyError where one is not a number."""
    try:
        values = tuple(float(part) for part in text.replace(",", " ").split())
    except ValueError:
        raise StudyError(f"Cannot read the points '{text[:40]}'", "numbers are expected", "Write them like 0.6, 0.7, 0.8", "points") from None
    if not values or not np.all(np.isfinite(values)):
        raise StudyError("No points to scan", "the list is empty or not finite", "Give at least one number", "points")
    return values


def _check_range(first: float, last: float, count: int) -> None:
    if count < 2:
        raise StudyError(f"{count} points make no curve", "a range needs its two ends", "Ask for at least 2 points", "points")
    if not np.isfinite([first, last]).all() or first == last:
        raise StudyError(f"The range {first:g} to {last:g} is empty", "its ends must be different numbers", "Give two different ends", "points")
