"""Thread limits for every test process, set before numpy is imported: two test workers with two threads each would fight for the cores."""

import os

for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "NUMBA_NUM_THREADS"):
    os.environ.setdefault(_name, "1")

os.environ.setdefault("NUMBA_CACHE_DIR", "")  # beside the source, where all test processes share what is compiled
