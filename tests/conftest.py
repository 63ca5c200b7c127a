"""Settings every test shares."""

from __future__ import annotations

from hypothesis import HealthCheck, settings

# The same examples on every machine, and no verdict from how busy the machine is.
settings.register_profile(
    "steady", deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile("steady")
