"""Settings every test shares."""

from __future__ import annotations

import os

# As the program itself does: with one thread, numbers are added up in one order and come out alike
# in this process and in the workers. Before anything imports numpy.
for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_name] = "1"

from hypothesis import HealthCheck, settings  # noqa: E402

# The same examples on every machine, and no verdict from how busy the machine is.
settings.register_profile(
    "steady", deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile("steady")
