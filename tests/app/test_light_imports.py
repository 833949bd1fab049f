"""The window's process loads no numerics: they take seconds, and belong to the workers."""

import subprocess
import sys
from pathlib import Path

import thalweg
import thalweg_app

HEAVY = ("pyqtgraph", "numba", "scipy", "pyscf", "openfermion", "h5py", "matplotlib", "sympy", "cirq")


def test_the_window_s_process_loads_no_numerics_and_no_plotting_before_it_shows():
    roots = [str(Path(package.__file__).parents[1]) for package in (thalweg, thalweg_app)]
    code = f"import sys; sys.path[:0] = {roots!r}; import thalweg_app.main; print([m for m in {HEAVY!r} if m in sys.modules])"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=120)
    assert found.stdout.strip() == "[]"


def test_a_worker_s_process_loads_no_qt():
    roots = [str(Path(package.__file__).parents[1]) for package in (thalweg, thalweg_app)]
    code = (
        f"import sys; sys.path[:0] = {roots!r}; import thalweg_app.worker_process as w; w.warm_up(); print([m for m in sys.modules if 'PySide' in m])"
    )
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=120)
    assert found.stdout.strip() == "[]"
