"""The kinds of request the window makes; each is a record that travels to the worker process and runs there."""

from collections.abc import Generator, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path

from cutblock.base.progress import Progress, part_of
from cutblock.flow.views import SpeedChart
from cutblock.records.curve import WasteCurves
from cutblock.records.drawing import Drawing
from cutblock.records.plan import Plan, Settings
from cutblock.records.record import Record
from cutblock.records.shop import LabelSheet

BLOCKS_AT_ONCE, TAGS_AT_ONCE = 2, 40  # pictures sent together: few, because the window takes them in one go


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Views(Record):
    """What the window shows of a plan beside the plan itself; tags and blocks follow as `Pictures`."""

    summary: tuple[tuple[str, str], ...]  # (what, how much with its unit)
    chart: SpeedChart
    sheets: tuple[LabelSheet, ...]
    sheet: str  # name of the one the tags are laid out for
    tags: tuple[Drawing, ...] = ()  # one a piece, in the order they are cut, titled with its code
    blocks: tuple[Drawing, ...] = ()  # one a block, in the order of the plan's blocks


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ShownPlan(Record):
    """A plan with its views."""

    plan: Plan
    views: Views

    def with_pictures(self, pictures: "Pictures") -> "ShownPlan":
        """Return this with more pictures, behind those it has."""
        views = self.views
        tags = pictures.tags if pictures.sheet != views.sheet else views.tags + pictures.tags
        if pictures.tags:
            views = replace(views, tags=tags, sheet=pictures.sheet)
        return replace(self, views=replace(views, blocks=views.blocks + pictures.blocks))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Pictures(Record):
    """The next pictures of a plan that is shown already; a tag takes the place of the one with the same title."""

    tags: tuple[Drawing, ...] = ()
    blocks: tuple[Drawing, ...] = ()
    sheet: str = ""  # name of the label sheet the tags are laid out for


Parts = Generator[ShownPlan | Pictures, None, None]


@dataclass(frozen=True, slots=True, kw_only=True)
class PlanRequest(Record):
    """Read a job file and make its plan; tells a `ShownPlan` and then its `Pictures`, some at a time."""

    job_path: str
    settings: Settings = field(default_factory=Settings)
    sheet: str = ""  # name of the label sheet to lay the tags out for; empty for the usual one

    def run(self, progress: Progress) -> Parts:
        """Do it; raises CutblockError as `read_job` and `make_plan` do."""
        from cutblock.flow.chain import make_plan
        from cutblock.flow.jobfile import read_job

        progress(0.0, "Reading the job file")
        job = read_job(self.job_path)
        plan = make_plan(job, progress=part_of(progress, 0.0, 0.95), settings=self.settings)
        yield from _show(plan, self.sheet, part_of(progress, 0.95, 1.0))


@dataclass(frozen=True, slots=True, kw_only=True)
class OpenRequest(Record):
    """Read a plan folder back; tells a `ShownPlan` and then its `Pictures`, some at a time."""

    folder: str
    sheet: str = ""  # name of the label sheet to lay the tags out for; empty for the usual one

    def run(self, progress: Progress) -> Parts:
        """Do it; raises CutblockError as `read_plan` does."""
        from cutblock.flow.folder import read_plan

        progress(0.0, "Reading the plan folder")
        plan = read_plan(self.folder)
        yield from _show(plan, self.sheet, part_of(progress, 0.5, 1.0))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Comparison(Record):
    """What the tolerance and the panel size of a job are worth, with its picture."""

    title: str
    unit: str
    curves: WasteCurves
    drawing: Drawing


@dataclass(frozen=True, slots=True, kw_only=True)
class CompareRequest(Record):
    """Make the plan of a job file again with other tolerances and other panel sizes; gives a `Comparison`."""

    job_path: str
    settings: Settings = field(default_factory=Settings)

    def run(self, progress: Progress) -> Comparison:
        """Do it; raises CutblockError as `read_job` and `waste_curves` do."""
        from cutblock.flow.curve import waste_curves
        from cutblock.flow.jobfile import read_job
        from cutblock.reports.curves import curves_drawing

        progress(0.0, "Reading the job file")
        job = read_job(self.job_path)
        curves = waste_curves(job, self.settings, progress)
        return Comparison(title=job.title, unit=job.units, curves=curves, drawing=curves_drawing(curves, job.units))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LayOutRequest(Record):
    """Lay the tags of a plan out for another label sheet; tells them as `Pictures`, some at a time."""

    plan: Plan
    sheet: str  # name of a label sheet of the catalogue

    def run(self, progress: Progress) -> Parts:
        """Do it."""
        progress(0.0, "Preparing the tags")
        yield from _lay_out(self.plan, self.sheet)


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


def _show(plan: Plan, sheet: str, progress: Progress) -> Parts:
    """Tell the plan first: its pictures take longer than all the rest that is shown."""
    from cutblock.catalog.load import label_sheets
    from cutblock.flow.views import LABEL_SHEET, block_drawings, speed_chart, summary

    sheet = sheet or LABEL_SHEET

    yield ShownPlan(
        plan=plan, views=Views(summary=summary(plan), chart=speed_chart(plan), sheets=label_sheets(), sheet=sheet)
    )
    progress(0.0, "Preparing the pictures of the blocks")
    for few in batched(block_drawings(plan), BLOCKS_AT_ONCE):
        yield Pictures(blocks=few)
    progress(0.4, "Preparing the tags")
    yield from _lay_out(plan, sheet)
    progress(1.0, "Done")


def _lay_out(plan: Plan, sheet: str) -> Parts:
    from cutblock.flow.views import tag_drawings

    for few in batched(tag_drawings(plan, sheet), TAGS_AT_ONCE):
        yield Pictures(tags=few, sheet=sheet)


def batched(drawings: tuple[Drawing, ...], size: int) -> Iterator[tuple[Drawing, ...]]:
    """Return the drawings in order, at most `size` at a time."""
    return (drawings[start : start + size] for start in range(0, len(drawings), size))
