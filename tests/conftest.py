"""Test profiles: few examples at the desk, many and always the same ones in continuous integration. Shared fixtures."""

import functools
import os

import pytest
from hypothesis import HealthCheck, settings
from kit.scenario_plans import made_once

# The window is tested without a screen unless another platform is asked for.
os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

settings.register_profile("dev", max_examples=25, deadline=None)
settings.register_profile(
    "ci", max_examples=100, deadline=None, derandomize=True, database=None, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile("ci" if os.environ.get("CI") else "dev")


@pytest.fixture(scope="session")
def scenario_folder(tmp_path_factory):
    """A function that returns the plan folder of a shipped scenario, which nobody may change."""
    base = tmp_path_factory.getbasetemp()
    is_one_of_many = "PYTEST_XDIST_WORKER" in os.environ  # each has a folder of its own inside that of the run
    root = (base.parent if is_one_of_many else base) / "scenario-plans"
    root.mkdir(exist_ok=True)
    return functools.partial(made_once, root=root)
