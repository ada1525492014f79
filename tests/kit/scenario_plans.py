"""Plan folders of the shipped scenarios, made once in a test run."""

import fcntl
from pathlib import Path

from kit.scenario_data import SCENARIOS

NAMES = sorted(path.parent.name for path in SCENARIOS.glob("*/job.toml"))


def made_once(name: str, root: Path) -> Path:
    """Return the plan folder of a scenario under `root`; the first process of the run that asks makes it.

    Many tests read the folder: who changes a file copies it first.
    """
    import cutblock

    folder = root / name
    with (root / f"{name}.lock").open("w") as lock:
        fcntl.flock(lock, fcntl.LOCK_EX)
        if not folder.is_dir():
            plan = cutblock.make_plan(cutblock.read_job(SCENARIOS / name / "job.toml"))
            cutblock.write_plan(plan, folder)
    return folder
