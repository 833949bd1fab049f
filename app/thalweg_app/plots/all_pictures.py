"""The list of pictures: name a new one here once. Its order is the order of the tabs and of Ctrl+1, Ctrl+2 and so on."""

from __future__ import annotations

from thalweg_app.plots.convergence import ConvergencePicture
from thalweg_app.plots.curve import CurvePicture
from thalweg_app.plots.diagnosis import DiagnosisPicture
from thalweg_app.plots.hamiltonian import HamiltonianPicture
from thalweg_app.plots.picture import Picture
from thalweg_app.plots.state import StatePicture

PICTURES: tuple[type[Picture], ...] = (ConvergencePicture, CurvePicture, HamiltonianPicture, StatePicture, DiagnosisPicture)
