"""Test profiles: few examples at the desk, many and always the same ones in continuous integration."""

import os

from hypothesis import HealthCheck, settings

# The window is tested without a screen unless another platform is asked for.
os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

settings.register_profile("dev", max_examples=25, deadline=None)
settings.register_profile(
    "ci", max_examples=100, deadline=None, derandomize=True, database=None, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile("ci" if os.environ.get("CI") else "dev")
