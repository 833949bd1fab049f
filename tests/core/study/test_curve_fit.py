"""Curve figures against curves whose constants are known in closed form."""

import numpy as np
import pytest

from thalweg.study.curve_fit import diatomic_constants, error_measures, fit_minimum, well_depth
from thalweg.units import BOHR_IN_ANGSTROM, ELECTRON_MASS_IN_DALTON, HARTREE_IN_INVERSE_CM

DEPTH, WIDTH, R_E, MASS = 0.17, 1.95, 0.7414, 0.50391261  # hartree, 1/angstrom, angstrom, dalton


def morse(r):
    return -1.0 + DEPTH * (1 - np.exp(-WIDTH * (np.asarray(r) - R_E))) ** 2


@pytest.mark.parametrize("grid", [np.linspace(0.5, 3.2, 40), np.geomspace(0.5, 4.0, 35), np.array([0.6, 0.65, 0.7, 0.74, 0.78, 0.85, 0.9])])
def test_a_morse_curve_gives_back_its_constants(grid):
    # Morse 1929: omega_e = a sqrt(2 D / mu), omega_e x_e = a^2 / (2 mu) in atomic units.
    minimum = fit_minimum(grid, morse(grid))
    constants = diatomic_constants(minimum, MASS)
    mass, width = MASS / ELECTRON_MASS_IN_DALTON, WIDTH * BOHR_IN_ANGSTROM
    assert minimum.r_e == pytest.approx(R_E, abs=2e-4)
    assert minimum.e_min == pytest.approx(-1.0, abs=1e-5)
    assert constants.omega_e == pytest.approx(width * np.sqrt(2 * DEPTH / mass) * HARTREE_IN_INVERSE_CM, rel=5e-3)
    assert constants.omega_e_x_e == pytest.approx(width**2 / (2 * mass) * HARTREE_IN_INVERSE_CM, rel=5e-2)
    assert minimum.first <= R_E <= minimum.last


def test_the_depth_is_given_only_where_the_curve_has_flattened():
    far, near = np.linspace(0.5, 6.0, 60), np.linspace(0.5, 1.4, 30)
    depth, sentence = well_depth(far, morse(far), fit_minimum(far, morse(far)))
    assert depth == pytest.approx(DEPTH, rel=1e-3)
    missing = DEPTH * (2 * np.exp(-WIDTH * (6.0 - R_E)))  # what the Morse curve gains beyond 6
    assert f"an estimated {1e3 * missing:.2g} mEh" in sentence
    depth, sentence = well_depth(near, morse(near), fit_minimum(near, morse(near)))
    assert depth is None
    assert "does not reach separated fragments" in sentence


def test_no_minimum_is_invented():
    r = np.linspace(1.0, 3.0, 20)
    assert fit_minimum(r, 1 / r) is None
    assert fit_minimum(r[:4], morse(r[:4])) is None


def test_a_curve_with_a_jump_is_not_fitted():
    r = np.linspace(0.5, 2.0, 20)
    assert fit_minimum(r, morse(r) + 0.01 * (r > 0.8)) is None


def test_sparse_points_say_how_uncertain_their_fit_is():
    r = np.linspace(0.5, 2.5, 9)
    sparse = fit_minimum(r, morse(r))
    fine = fit_minimum(np.linspace(0.5, 2.5, 41), morse(np.linspace(0.5, 2.5, 41)))
    assert abs(sparse.r_e - R_E) < 5 * sparse.r_e_spread
    assert sparse.r_e_spread > 20 * fine.r_e_spread
    assert "with a degree one off the minimum moves by" in sparse.sentence()


def test_a_parabola_in_an_angle_needs_no_logarithm():
    degrees = np.linspace(80, 130, 15)
    minimum = fit_minimum(degrees, 1e-4 * (degrees - 104.5) ** 2, logarithmic=False)
    assert minimum.r_e == pytest.approx(104.5)
    assert minimum.curvature == pytest.approx(2e-4)


def test_error_measures_by_hand():
    measures = error_measures([1.0, 0.5, 2.1], [0.9, 0.3, 2.1])
    assert measures.maximum == pytest.approx(0.2)
    assert measures.mean == pytest.approx(0.1)
    assert measures.npe == pytest.approx(0.2)
    assert measures.at_minimum == pytest.approx(0.2)
