from dataclasses import replace

import pytest
from kit.shown import sample_shown
from PySide6.QtWidgets import QApplication

from cutblock.records.curve import CurvePoint, WasteCurves
from cutblock.reports.curves import curves_drawing
from cutblock.window.options import OPTION_COLUMNS, OptionsDialog, option_rows
from cutblock.worker.events import Part, Result
from cutblock.worker.requests import CompareRequest, Comparison

HERE = CurvePoint(
    tolerance_mm=2.0,
    cell_mm=(1200.0, 1000.0),
    is_job=True,
    n_panels=24,
    n_paired=24,
    n_sweeps=12,
    n_blocks=2,
    used_percent=86.0,
    waste_percent=14.0,
    hours_s=36000.0,
    cost=1617.5,
)
FINE = replace(HERE, is_job=False, tolerance_mm=1.0, n_sweeps=16)
LARGE = CurvePoint(
    tolerance_mm=2.0, cell_mm=(1500.0, 1250.0), n_panels=15, n_uncut=15, refusal="no block is large enough"
)
CURVES = WasteCurves(by_tolerance=(FINE, HERE), by_size=(HERE, LARGE))


@pytest.fixture
def comparison():
    return Comparison(title="Wall", unit="mm", curves=CURVES, drawing=curves_drawing(CURVES, "mm"))


def test_every_plan_has_a_row_with_a_cell_a_column(comparison):
    rows = list(option_rows(comparison))

    assert len(rows) == 4
    assert {len(row.cells) for row in rows} == {len(OPTION_COLUMNS)}
    words = [[cell.text for cell in row.cells] for row in rows]
    assert words[1][:5] == ["the job as it stands", "2 mm", "1200 × 1000 mm", "24", "24"]
    assert words[1][-4:] == ["86.0", "14.0", "10.0", "1,617.50"]
    assert words[3][0] == "no plan: no block is large enough"
    assert set(words[3][4:]) == {"–"}


def test_comparing_plans_the_job_again_and_opens_the_dialog(qtbot, window, worker, comparison):
    shown = sample_shown()
    window.open_job("/jobs/wall/job.toml")
    worker.events += [Part(ticket=1, value=shown), Result(ticket=1, value=None)]
    qtbot.waitUntil(lambda: not worker.is_busy, timeout=2000)
    window.desks.finish()

    window.desks.estimating.compare.click()
    assert worker.requests[-1] == CompareRequest(job_path="/jobs/wall/job.toml")
    assert not window.desks.estimating.compare.isEnabled()
    worker.events.append(Result(ticket=2, value=comparison))
    qtbot.waitUntil(lambda: not worker.is_busy, timeout=2000)

    (dialog,) = [each for each in QApplication.topLevelWidgets() if isinstance(each, OptionsDialog)]
    assert dialog.isVisible()
    assert dialog.rows.rowCount() == 4
    assert "nothing of the job was changed" in window.status.text.text()
    assert window.shown is not None
    dialog.close()


def test_without_a_job_file_nothing_can_be_compared(qtbot, window, worker):
    window.open_folder("/plans/wall")
    worker.events += [Part(ticket=1, value=sample_shown()), Result(ticket=1, value=None)]
    qtbot.waitUntil(lambda: not worker.is_busy, timeout=2000)
    window.desks.finish()

    assert not window.menus.compare.isEnabled()
    assert not window.desks.estimating.compare.isEnabled()
    window.compare()
    assert len(worker.requests) == 1
