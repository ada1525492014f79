"""Where the foam goes, on the page: the account of the job, of each grade and of the scrap, to the thousandth litre.

The volumes are sums of the blocks' own, each in whole thousandths of a litre, so that every column adds up as printed.
"""

from collections.abc import Iterable, Mapping

from cutblock.base.units import litres, mass_kg
from cutblock.records.account import LEDGER_PARTS, Ledger
from cutblock.records.plan import Plan
from cutblock.records.words import Duty
from cutblock.reports.colours import LEDGER_LOOK
from cutblock.reports.ledger_bar import ledger_drawing
from cutblock.reports.markup import paragraph, table
from cutblock.reports.svg import svg_text


def foam_body(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return the account as a bar, a sentence on the waste figure, and a table that adds up.

    Args:
        plan: A complete plan.
        block_ledgers: The volume account of each block by its id.
    """
    ledger = plan.ledger
    if ledger is None or ledger.bought_mm3 == 0.0:
        return paragraph("No foam is bought.")
    grades: dict[str, list[Ledger]] = {}
    for block in plan.blocks:
        grades.setdefault(block.grade, []).append(block_ledgers[block.id])
    body = _table(_sum(block_ledgers[block.id] for block in plan.blocks))
    if len(grades) > 1:
        body += "".join(f"{paragraph(grade)}{_table(_sum(ledgers))}" for grade, ledgers in grades.items())
    words = (
        f"{paragraph(_used_words(ledger))}{paragraph(ledger.waste_words)}{paragraph(_scrap_words(plan, block_ledgers))}"
    )
    return f"{svg_text(ledger_drawing(ledger))}{words}{body}"


def _sum(ledgers: Iterable[Ledger]) -> dict[str, int]:
    """Return the parts of several blocks and what was bought, in whole thousandths of a litre."""
    total = dict.fromkeys((*LEDGER_PARTS, "bought"), 0)
    for ledger in ledgers:
        for name, volume in ledger.parts_ml.items():
            total[name] += volume
        total["bought"] += ledger.bought_ml
    return total


def _table(volumes: Mapping[str, int]) -> str:
    bought = volumes["bought"]
    rows = [
        (label, f"{volumes[name] / 1000:.3f}", f"{100.0 * volumes[name] / bought:.2f}")
        for name, label, _, _ in LEDGER_LOOK
        if volumes[name] > 0
    ]
    rows.append(("Bought, the sum of it all", f"{bought / 1000:.3f}", "100.00"))
    kinds = [""] * (len(rows) - 1) + ["sum"]
    return table(("part", "litres", "% of bought"), rows, numbers=(1, 2), kinds=kinds)


def _used_words(ledger: Ledger) -> str:
    bought, used, offcuts = (
        f"{litres(volume):,.0f}" for volume in (ledger.bought_mm3, ledger.used_mm3, ledger.offcut_mm3)
    )
    return (
        f"Of {bought} litres bought, {used} ({ledger.used_percent:.1f} %) become halves that have a duty."
        f" {offcuts} litres stay as offcuts for other jobs and count as neither used nor waste."
    )


def _scrap_words(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return what bin the scrap goes into: clean and coated foam are kept apart."""
    scrap_mm3 = {block.id: block_ledgers[block.id].scrap_mm3 for block in plan.blocks}
    weight_kg = sum(
        mass_kg(scrap_mm3[block.id], block.density_kg_m3 or plan.conditions.density_kg_m3) for block in plan.blocks
    )
    words = (
        f"The scrap, {litres(sum(scrap_mm3.values())):,.1f} litres or about {weight_kg:.1f} kg, is all clean foam,"
        " which makers take back: leftovers are never coated, and pieces are trimmed to their outline before they are."
    )
    if plan.job.coat_mm <= 0.0:
        return words
    coated = sum(p.volume_mm3 for p in plan.pieces if p.duty in (Duty.MOULD, Duty.COUNTER_MOULD))
    return f"{words} The {litres(coated):,.0f} litres of coated moulds go into another bin once they are used up."
