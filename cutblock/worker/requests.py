"""The kinds of request the window makes; each is a record that travels to the worker process and runs there."""

from dataclasses import dataclass, field
from pathlib import Path

from cutblock.base.progress import Progress, part_of
from cutblock.flow.views import SpeedChart
from cutblock.records.drawing import Drawing
from cutblock.records.plan import Plan, Settings
from cutblock.records.record import Record
from cutblock.records.shop import LabelSheet


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Views(Record):
    """What the window shows of a plan beside the plan itself."""

    tags: tuple[Drawing, ...]  # one a piece, in the order they are cut, titled with its code
    blocks: tuple[Drawing, ...]  # one a block, in the order of the plan's blocks
    summary: tuple[tuple[str, str], ...]  # (what, how much with its unit)
    chart: SpeedChart
    sheets: tuple[LabelSheet, ...]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ShownPlan(Record):
    """A plan with its views."""

    plan: Plan
    views: Views


@dataclass(frozen=True, slots=True, kw_only=True)
class PlanRequest(Record):
    """Read a job file and make its plan; gives a `ShownPlan`."""

    job_path: str
    settings: Settings = field(default_factory=Settings)

    def run(self, progress: Progress) -> ShownPlan:
        """Do it; raises CutblockError as `read_job` and `make_plan` do."""
        from cutblock.flow.chain import make_plan
        from cutblock.flow.jobfile import read_job

        progress(0.0, "Reading the job file")
        job = read_job(self.job_path)
        plan = make_plan(job, progress=part_of(progress, 0.0, 0.95), settings=self.settings)
        return _shown(plan, part_of(progress, 0.95, 1.0))


@dataclass(frozen=True, slots=True, kw_only=True)
class OpenRequest(Record):
    """Read a plan folder back; gives a `ShownPlan`."""

    folder: str

    def run(self, progress: Progress) -> ShownPlan:
        """Do it; raises CutblockError as `read_plan` does."""
        from cutblock.flow.folder import read_plan

        progress(0.0, "Reading the plan folder")
        plan = read_plan(self.folder)
        return _shown(plan, part_of(progress, 0.5, 1.0))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SaveRequest(Record):
    """Write the plan folder, all or nothing; gives its path."""

    plan: Plan
    folder: str

    def run(self, progress: Progress) -> str:
        """Do it; raises CutblockError as `write_plan` does."""
        from cutblock.flow.folder import write_plan

        write_plan(self.plan, self.folder, progress)
        return self.folder


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class TagsRequest(Record):
    """Write the tags of all pieces as a PDF on label sheets; gives its path."""

    plan: Plan
    sheet: str  # name of a label sheet of the catalogue
    start: int  # first free label of the first sheet, from 1
    path: str

    def run(self, progress: Progress) -> str:
        """Do it; an earlier file stays as it is until the new one is whole."""
        from cutblock.flow.folder import replace_file
        from cutblock.flow.views import tags_pdf

        progress(0.0, "Drawing the tags")
        content = tags_pdf(self.plan, self.sheet, self.start)
        progress(0.9, "Writing the tags")
        replace_file(Path(self.path), content)
        return self.path


def _shown(plan: Plan, progress: Progress) -> ShownPlan:
    from cutblock.catalog.load import label_sheets
    from cutblock.flow.views import block_drawings, speed_chart, summary, tag_drawings

    progress(0.0, "Drawing tags and blocks")
    views = Views(
        tags=tag_drawings(plan),
        blocks=block_drawings(plan),
        summary=summary(plan),
        chart=speed_chart(plan),
        sheets=label_sheets(),
    )
    progress(1.0, "Done")
    return ShownPlan(plan=plan, views=views)
