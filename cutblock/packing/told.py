"""What is worth telling about the stock of a job."""

from collections.abc import Sequence

from cutblock.base.units import mm_per
from cutblock.packing.kinds import Kinds, may_serve
from cutblock.records.block import Block
from cutblock.records.job import Job, StockSpec
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions
from cutblock.records.words import Severity


def stock_findings(job: Job, kinds: Kinds, blocks: Sequence[Block], conditions: Conditions) -> tuple[Finding, ...]:
    """Return the findings about blocks of other grades, missing prices, and offcuts that are of no use.

    Args:
        job: Its stock.
        kinds: What it may be cut from.
        blocks: What it is cut from.
        conditions: The density the speeds are planned for.
    """
    return (
        *_other_grades(job),
        *_missing_prices(kinds),
        *_offcuts(job, kinds),
        *_better_grades(blocks, conditions),
    )


def _other_grades(job: Job) -> list[Finding]:
    return [
        Finding(
            severity=Severity.INFO,
            code="block-of-other-grade",
            subject=spec.place,
            text=f"{'An offcut' if spec.is_offcut else 'A block'} of {spec.grade} is not used: the job is in"
            f' "{job.grade}".',
        )
        for spec in job.stock
        if not may_serve(spec, job)
    ]


def _missing_prices(kinds: Kinds) -> list[Finding]:
    bought = [kind.spec for kind in kinds.kinds if not kind.spec.is_offcut]
    priced = [spec for spec in bought if spec.price is not None]
    if not 0 < len(priced) < len(bought):
        return []
    missing = next(spec for spec in bought if spec.price is None)
    text = (
        f"This block of {missing.grade} has no price, so prices were left out of the choice of blocks:"
        " fewest blocks were taken instead. Give it a price."
    )
    return [Finding(severity=Severity.WARNING, code="price-missing", subject=missing.place, text=text)]


def _offcuts(job: Job, kinds: Kinds) -> list[Finding]:
    findings = []
    if kinds.unusable:
        largest = max(kinds.unusable, key=lambda spec: spec.length_mm * spec.width_mm * spec.height_mm)
        is_all = not any(kind.spec.is_offcut for kind in kinds.kinds) and not kinds.left_out
        text = (
            f"{'None of the offcuts' if is_all else f'{len(kinds.unusable)} offcuts'} can hold a billet;"
            f" the largest of them is {_size_text(largest, job)}. Smaller panels would make use of it."
        )
        findings.append(
            Finding(
                severity=Severity.WARNING if is_all else Severity.INFO,
                code="offcuts-unusable",
                subject=largest.place,
                text=text,
            )
        )
    if kinds.left_out:
        text = (
            f"{len(kinds.left_out)} of the smaller offcuts were left out of the search, which takes"
            f" {len({kind.pool for kind in kinds.kinds if kind.spec.is_offcut})} sizes at most for this many billets."
        )
        findings.append(
            Finding(severity=Severity.INFO, code="offcuts-left-out", subject=kinds.left_out[0].place, text=text)
        )
    return findings


def _size_text(spec: StockSpec, job: Job) -> str:
    sizes = (spec.length_mm, spec.width_mm, spec.height_mm)
    return " x ".join(f"{round(size / mm_per(job.units), 3):g}" for size in sizes) + f" {job.units}"


def _better_grades(blocks: Sequence[Block], conditions: Conditions) -> list[Finding]:
    findings = []
    for block in blocks:
        if block.density_kg_m3 is None:
            continue
        # The kerf beyond the wire's own goes with 1 / density at the same speed.
        share = conditions.density_kg_m3 / block.density_kg_m3
        kerf_mm = conditions.least_kerf_mm + (conditions.kerf_mm - conditions.least_kerf_mm) * share
        text = (
            f"It is of {block.grade}, {block.density_kg_m3:g} kg/m3, in the place of the job's grade. The speeds are"
            f" planned for {conditions.density_kg_m3:g} kg/m3: at the same speed the kerf is about {kerf_mm:.2f} mm"
            f" instead of {conditions.kerf_mm:.2f} mm. Cut a coupon of it first, and cut slower."
        )
        findings.append(Finding(severity=Severity.WARNING, code="block-of-better-grade", subject=block.id, text=text))
    return findings
