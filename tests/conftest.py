"""Settings for every test run."""

from __future__ import annotations

import os

# Many small dense solutions: threads of the linear algebra library only get in each other's way, and in xdist's.
for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")
