"""Start-up stays light, and the rooms stay in their layers."""

import subprocess
import sys
from pathlib import Path

import pytest

HEAVY = ("scipy", "trimesh", "PySide6", "shapely", "manifold3d", "reportlab", "networkx", "pyqtgraph", "numba")


@pytest.mark.parametrize(
    "statement",
    ["import cutblock", "from cutblock.cli.main import main; main(['--version'])", "import cutblock.flow.jobfile"],
)
def test_start_up_loads_no_heavy_library(statement):
    code = (
        f"import sys\ntry:\n    {statement}\nexcept SystemExit:\n    pass\n"
        f"print(sorted(set({HEAVY!r}) & {{name.split('.')[0] for name in sys.modules}}))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)

    assert done.stdout.splitlines()[-1] == "[]"


def test_the_kernel_functions_are_reached_from_the_package():
    code = (
        "import cutblock\n"
        "print(cutblock.geometry.volume_below, cutblock.geometry.fit_ruled, cutblock.geometry.split_billet,"
        " cutblock.wire.kerf_rate, cutblock.wire.speed_window, cutblock.packing.pack,"
        " cutblock.read_job, cutblock.make_plan, cutblock.write_plan)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)

    assert done.returncode == 0, done.stderr


def test_the_work_rooms_run_without_qt():
    code = (
        "import sys\n"
        "sys.modules['PySide6'] = None\n"
        "import cutblock.flow.outputs, cutblock.flow.check, cutblock.flow.views, cutblock.worker.process"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)

    assert done.returncode == 0, done.stderr


def test_layers_hold():
    done = subprocess.run([Path(sys.executable).with_name("lint-imports")], capture_output=True, text=True, check=False)

    assert done.returncode == 0, done.stdout
