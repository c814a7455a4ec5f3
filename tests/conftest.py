"""Shared settings of all tests."""

import os

from hypothesis import settings

# One BLAS thread per worker, set before numpy is first imported by a test module.
for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")
os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

settings.register_profile("steady", derandomize=True, deadline=None)
settings.load_profile("steady")
