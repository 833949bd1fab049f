"""Imported by the process that workers are forked from: the smallest molecule is run once, so that every worker finds its code loaded.

Compiled kernels are read from the disk at their first call, which takes a worker longer than a point of a small scan.
"""

from __future__ import annotations

import contextlib
import gc

from thalweg.study.problem import forget_everything
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule

with contextlib.suppress(Exception):  # whatever is wrong here is told by the point that meets it, not by the server
    run(StudySpec(system=Molecule(atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.74)))))
    forget_everything()
    gc.collect()  # PySCF's objects hold temporary files, which every worker would remove at its end
