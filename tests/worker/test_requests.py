from functools import reduce

import numpy as np
import pytest
from kit.sample import sample_job, sample_plan

from cutblock.base.errors import Cancelled
from cutblock.flow.views import SpeedChart
from cutblock.records.drawing import Drawing
from cutblock.records.plan import Settings
from cutblock.worker.requests import (
    BLOCKS_AT_ONCE,
    TAGS_AT_ONCE,
    OpenRequest,
    PlanRequest,
    SaveRequest,
    ShownPlan,
    TagsRequest,
)

DRAWING = Drawing(width_mm=80.0, height_mm=60.0, marks=())
CHART = SpeedChart(
    densities_kg_m3=np.array([10.0, 40.0]),
    low_mm_s=np.array([2.0, 1.0]),
    high_mm_s=np.array([4.0, 2.0]),
    density_kg_m3=20.0,
    planned_mm_s=2.0,
    is_calibrated=False,
)


@pytest.fixture
def plan(monkeypatch):
    """Give a plan whose views are small stand-ins: what the rooms draw is tested there."""
    made = sample_plan()
    monkeypatch.setattr("cutblock.flow.views.tag_drawings", lambda plan, sheet: (DRAWING,) * len(plan.pieces))
    monkeypatch.setattr("cutblock.flow.views.block_drawings", lambda plan: (DRAWING,) * len(plan.blocks))
    monkeypatch.setattr("cutblock.flow.views.summary", lambda plan: (("Blocks", "1"),))
    monkeypatch.setattr("cutblock.flow.views.speed_chart", lambda plan: CHART)
    monkeypatch.setattr("cutblock.catalog.load.label_sheets", lambda: ())
    return made


def test_a_plan_request_reads_the_job_and_plans_it_with_the_given_settings(plan, monkeypatch):
    seen = []
    monkeypatch.setattr("cutblock.flow.jobfile.read_job", lambda path: (seen.append(path), sample_job())[1])
    monkeypatch.setattr(
        "cutblock.flow.chain.make_plan", lambda job, progress, settings: (seen.append(settings), plan)[1]
    )
    fractions = []

    request = PlanRequest(job_path="a/job.toml", settings=Settings(seed=5))
    first, *pictures = request.run(lambda f, text: fractions.append(f))

    assert first.plan is plan
    assert first.views.tags == first.views.blocks == ()
    shown = reduce(ShownPlan.with_pictures, pictures, first)
    assert seen == ["a/job.toml", Settings(seed=5)]
    assert len(shown.views.tags) == len(plan.pieces)
    assert len(shown.views.blocks) == len(plan.blocks)
    assert all(len(few.tags) <= TAGS_AT_ONCE and len(few.blocks) <= BLOCKS_AT_ONCE for few in pictures)
    assert fractions == sorted(fractions)
    assert fractions[-1] == 1.0


def test_a_cancel_in_the_progress_passes_through_a_plan_request(plan, monkeypatch):
    monkeypatch.setattr("cutblock.flow.jobfile.read_job", lambda path: sample_job())
    monkeypatch.setattr("cutblock.flow.chain.make_plan", lambda job, progress, settings: progress(0.5, "fitting"))

    def stop(fraction, text):
        if text == "fitting":
            raise Cancelled

    with pytest.raises(Cancelled):
        list(PlanRequest(job_path="a/job.toml").run(stop))


def test_an_open_request_gives_the_plan_of_the_folder(plan, monkeypatch):
    monkeypatch.setattr("cutblock.flow.folder.read_plan", lambda folder: plan if folder == "here" else None)

    assert next(OpenRequest(folder="here").run(lambda f, text: None)).plan is plan


def test_a_save_request_writes_the_plan_and_gives_the_folder(plan, monkeypatch):
    written = []
    monkeypatch.setattr("cutblock.flow.folder.write_plan", lambda plan, folder, progress: written.append(folder))

    assert SaveRequest(plan=plan, folder="out").run(lambda f, text: None) == "out"
    assert written == ["out"]


def test_a_tags_request_writes_the_whole_pdf(plan, monkeypatch, tmp_path):
    monkeypatch.setattr("cutblock.flow.views.tags_pdf", lambda plan, sheet, start: f"{sheet} {start}".encode())
    path = tmp_path / "tags.pdf"

    TagsRequest(plan=plan, sheet="a4-2x4", start=3, path=str(path)).run(lambda f, text: None)

    assert path.read_bytes() == b"a4-2x4 3"
