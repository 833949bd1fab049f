"""What a curve yields: errors along it, and the constants of a diatomic from a stated fit."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.units import BOHR_IN_ANGSTROM, ELECTRON_MASS_IN_DALTON, HARTREE_IN_INVERSE_CM

#: Points nearest the minimum that a fit uses at most, and the largest degree of its polynomial.
FIT_POINTS, FIT_DEGREE = 11, 9
#: The degree rises until the root mean square residual (Eh) is below this, or one point is left over.
GOOD_RESIDUAL = 1e-8
#: A fit whose root mean square residual is larger than this (Eh) is not trusted.
LARGEST_RESIDUAL = 2e-4
#: Nor is one whose curvature moves by more than this part when the degree changes by one.
LARGEST_SPREAD = 0.15
#: Moves of the minimum below this part of r_e are alike.
LIKE = 2e-5
#: The part of the well that may still be missing at the far end of a curve for it to count as the separated fragments.
MISSING_PART = 0.01


@dataclass(frozen=True)
class ErrorMeasures:
    """Errors of one curve against another, in the energy unit of the curve.

    The non-parallelity error is the largest minus the smallest signed error (common practice).
    """

    maximum: float
    mean: float
    npe: float
    at_minimum: float


@dataclass(frozen=True)
class CurveMinimum:
    """A minimum found by a local polynomial fit.

    Attributes:
        r_e, e_min: position (unit of the coordinate) and energy of the minimum.
        curvature: second derivative of the energy there, energy unit / coordinate unit squared.
        third, fourth: higher derivatives there.
        first, last: range of the coordinate that was fitted.
        degree, points: of the polynomial.
        residual: root mean square of the fit.
        variable: that the polynomial is in.
        r_e_spread, curvature_spread: how far r_e (unit of the coordinate) and the curvature (as a part) move with a degree one off.
    """

    r_e: float
    e_min: float
    curvature: float
    third: float
    fourth: float
    first: float
    last: float
    degree: int
    points: int
    residual: float
    variable: str
    r_e_spread: float
    curvature_spread: float

    def scaled(self, factor: float) -> CurveMinimum:
        """The same minimum with the coordinate multiplied by `factor`, as from bohr to angstrom."""
        return replace(
            self,
            r_e=self.r_e * factor,
            curvature=self.curvature / factor**2,
            third=self.third / factor**3,
            fourth=self.fourth / factor**4,
            first=self.first * factor,
            last=self.last * factor,
            r_e_spread=self.r_e_spread * factor,
        )

    def sentence(self) -> str:
        return (
            f"polynomial of degree {self.degree} in {self.variable} through {self.points} points from {self.first:.4g} to {self.last:.4g}, "
            f"root mean square residual {self.residual:.2g}; with a degree one off the minimum moves by {self.r_e_spread:.1g} "
            f"and the frequency by {50 * self.curvature_spread:.1g} %"
        )


@dataclass(frozen=True)
class DiatomicConstants:
    """Harmonic frequency and anharmonicity, cm^-1, from the derivatives at the minimum (Dunham 1932)."""

    omega_e: float
    omega_e_x_e: float
    b_e: float


def error_measures(energies: Sequence[float], exact: Sequence[float]) -> ErrorMeasures:
    """Measures over all points at which both curves exist (at least one)."""
    errors = np.asarray(energies) - np.asarray(exact)
    return ErrorMeasures(
        maximum=float(np.abs(errors).max()),
        mean=float(np.abs(errors).mean()),
        npe=float(errors.max() - errors.min()),
        at_minimum=float(errors[int(np.argmin(exact))]),
    )


def fit_minimum(coordinates: Sequence[float], energies: Sequence[float], *, logarithmic: bool = True) -> CurveMinimum | None:
    """The minimum of a curve, or None where the curve has no inner minimum, too few points, or follows no smooth fit.

    Fits a polynomial in ln(r/r0), with r0 the lowest point: at the same degree it follows both walls of a bond better than one in r or
    1/r (tried on full-CI curves of H2). With `logarithmic` False in (r - r0), for angles and factors. Of several numbers of points the
    largest is taken whose minimum hardly moves when the degree changes by one: with sparse points a small residual proves nothing.
    """
    r, e = _sorted(coordinates, energies)
    lowest = int(np.argmin(e)) if e.size else 0
    if e.size < 5 or lowest in (0, e.size - 1):
        return None
    windows = dict.fromkeys((w.start, w.stop) for w in (_window(r, lowest, points) for points in range(FIT_POINTS, 4, -2)))
    fits = [_fit(r[a:b], e[a:b], r[lowest], logarithmic) for a, b in windows]
    trusted = [fit for fit in fits if fit is not None]
    least = min((fit.r_e_spread for fit in trusted), default=0.0)
    return next((fit for fit in trusted if fit.r_e_spread <= max(3.0 * least, LIKE * abs(fit.r_e))), None)


def _fit(r: FloatArray, e: FloatArray, r0: float, logarithmic: bool) -> CurveMinimum | None:
    shift = float(e.min())
    z = _variable(r, r0, logarithmic)
    degree, polynomial, residual = _smallest_good_fit(z, e - shift)
    other = np.polynomial.Polynomial.fit(z, e - shift, degree - 1 if degree > 3 else degree + 1)
    place, other_place = (_stationary(p, r, r0, logarithmic) for p in (polynomial, other))
    if place is None or other_place is None or residual > LARGEST_RESIDUAL:
        return None
    energy, _, second, third, fourth = _derivatives(polynomial, place, r0, logarithmic)
    spread = abs(_derivatives(other, other_place, r0, logarithmic)[2] / second - 1.0)
    if spread > LARGEST_SPREAD:
        return None
    return CurveMinimum(
        r_e=place,
        e_min=energy + shift,
        curvature=second,
        third=third,
        fourth=fourth,
        first=float(r[0]),
        last=float(r[-1]),
        degree=degree,
        points=int(r.size),
        residual=residual,
        variable="ln r" if logarithmic else "the coordinate",
        r_e_spread=abs(other_place - place),
        curvature_spread=spread,
    )


def diatomic_constants(minimum: CurveMinimum, reduced_mass: float) -> DiatomicConstants:
    """omega_e = sqrt(k/mu), omega_e x_e = 3/2 B_e (5/4 a1^2 - a2), with V = a0 xi^2 (1 + a1 xi + a2 xi^2) (Dunham 1932).

    `minimum` in hartree and angstrom, `reduced_mass` in dalton.
    """
    mass = reduced_mass / ELECTRON_MASS_IN_DALTON
    r = minimum.r_e / BOHR_IN_ANGSTROM
    second, third, fourth = (d * BOHR_IN_ANGSTROM**n for d, n in ((minimum.curvature, 2), (minimum.third, 3), (minimum.fourth, 4)))
    a1, a2 = third * r / (3 * second), fourth * r**2 / (12 * second)
    b_e = 1 / (2 * mass * r**2)
    return DiatomicConstants(
        omega_e=float(np.sqrt(second / mass)) * HARTREE_IN_INVERSE_CM,
        omega_e_x_e=float(1.5 * b_e * (1.25 * a1**2 - a2)) * HARTREE_IN_INVERSE_CM,
        b_e=float(b_e) * HARTREE_IN_INVERSE_CM,
    )


def well_depth(coordinates: Sequence[float], energies: Sequence[float], minimum: CurveMinimum) -> tuple[float | None, str]:
    """D_e, the energy of the far end above the minimum, or None where the curve has not reached separated fragments there; and a sentence.

    What is still missing at the end is estimated from the last two slopes, taken to fall off exponentially.
    """
    r, e = _sorted(coordinates, energies)
    depth = float(e[-1] - minimum.e_min)
    missing = _beyond(r, e, minimum.r_e)
    still = f"at {r[-1]:.4g} the curve still {'rises' if missing > 0 else 'falls'} by an estimated {1e3 * abs(missing):.3g} mEh"
    if r[-1] <= minimum.last or abs(missing) > MISSING_PART * depth:
        return None, f"the curve does not reach separated fragments; {still}"
    return depth, f"energy at {r[-1]:.4g} above the minimum; {still} beyond"


def _beyond(r: FloatArray, e: FloatArray, r_e: float) -> float:
    """Energy that the curve still gains beyond its last point; where the slope does not fall off, what it gains over another r_e."""
    h1, h2 = float(r[-2] - r[-3]), float(r[-1] - r[-2])
    before, last = float(e[-2] - e[-3]) / h1, float(e[-1] - e[-2]) / h2
    if last == 0.0 or before / last <= 1.0:
        return last * r_e
    rate = float(np.log(before / last)) / (0.5 * (h1 + h2))
    return last * float(np.exp(-0.5 * rate * h2)) / rate


def _sorted(coordinates: Sequence[float], energies: Sequence[float]) -> tuple[FloatArray, FloatArray]:
    r, e = np.asarray(coordinates, float), np.asarray(energies, float)
    order = np.argsort(r)
    return r[order], e[order]


def _window(r: FloatArray, lowest: int, points: int) -> slice:
    """The lowest point with at most half of the points on each side."""
    half = points // 2
    first = max(0, lowest - half)
    last = min(r.size, max(lowest + half, first + points - 1) + 1)
    return slice(max(0, last - points), last)


def _variable(r: FloatArray | float, r0: float, logarithmic: bool) -> FloatArray:
    return np.asarray(np.log(r / r0) if logarithmic else r - r0)


def _smallest_good_fit(z: FloatArray, e: FloatArray) -> tuple[int, np.polynomial.Polynomial, float]:
    """Degree, polynomial and root mean square residual of the lowest degree that fits well: more would only follow noise."""
    for degree in range(2, min(FIT_DEGREE, z.size - 2) + 1):
        polynomial = np.polynomial.Polynomial.fit(z, e, degree)
        residual = float(np.sqrt(np.mean((polynomial(z) - e) ** 2)))
        if residual < GOOD_RESIDUAL:
            break
    return degree, polynomial, residual


def _stationary(polynomial: np.polynomial.Polynomial, r: FloatArray, r0: float, logarithmic: bool) -> float | None:
    """The stationary point nearest the lowest point of the curve, with positive curvature, inside the fitted range."""
    roots = polynomial.deriv().roots()
    real = roots[np.abs(roots.imag) < 1e-9].real
    places = [r0 * np.exp(z) if logarithmic else r0 + z for z in real if abs(z) < 50]
    inside = [p for p in places if r[0] <= p <= r[-1] and _derivatives(polynomial, p, r0, logarithmic)[2] > 0]
    return float(min(inside, key=lambda p: abs(p - r0))) if inside else None


def _derivatives(polynomial: np.polynomial.Polynomial, r: float, r0: float, logarithmic: bool) -> tuple[float, float, float, float, float]:
    """The polynomial and its first four derivatives with respect to r (Faa di Bruno's rule for z(r) = ln(r/r0))."""
    z = float(_variable(r, r0, logarithmic))
    p = [float(polynomial.deriv(n)(z)) if n else float(polynomial(z)) for n in range(5)]
    if not logarithmic:
        return p[0], p[1], p[2], p[3], p[4]
    z1, z2, z3, z4 = 1 / r, -1 / r**2, 2 / r**3, -6 / r**4
    return (
        p[0],
        p[1] * z1,
        p[2] * z1**2 + p[1] * z2,
        p[3] * z1**3 + 3 * p[2] * z1 * z2 + p[1] * z3,
        p[4] * z1**4 + 6 * p[3] * z1**2 * z2 + p[2] * (4 * z1 * z3 + 3 * z2**2) + p[1] * z4,
    )
