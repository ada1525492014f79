from dataclasses import replace

import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from kit.sample import sample_panel, sample_plan, sample_sweep
from kit.shown import grid_plan

from cutblock.records.block import Freed
from cutblock.records.plan import Finding
from cutblock.records.words import Severity
from cutblock.window import rows
from cutblock.window.deviation import STEPS, legend_text, step_of, worst_by_panel
from cutblock.window.parts import ledger_parts


def texts(row):
    return [cell.text for cell in row.cells]


def column(columns, title):
    return next(number for number, column in enumerate(columns) if column.title.startswith(title))


def test_every_table_has_a_cell_for_every_column():
    plan = grid_plan(2, 2, {"S-A02": None})
    tables = (
        (rows.PANEL_COLUMNS, rows.panel_rows(plan)),
        (rows.PIECE_COLUMNS, rows.piece_rows(plan.pieces)),
        (rows.CUT_COLUMNS, rows.cut_rows(plan, plan.blocks[0])),
        (rows.BLOCK_COLUMNS, rows.block_rows(plan)),
        (rows.LEDGER_COLUMNS, rows.ledger_rows(ledger_parts(plan.ledger), plan.ledger)),
        (rows.FINDING_COLUMNS, rows.finding_rows(plan.findings)),
    )
    for columns, generated in tables:
        found = list(generated)
        assert found
        assert all(len(row.cells) == (1 if row.is_heading else len(columns)) for row in found)


def test_a_panel_says_whether_it_is_within_by_letter_and_word():
    plan = grid_plan(1, 3, {"S-A01": 0.4, "S-A02": 2.01, "S-A03": None})
    tolerance = column(rows.PANEL_COLUMNS, "Tolerance")

    found = [row.cells[tolerance] for row in rows.panel_rows(plan)]

    assert [cell.text for cell in found] == ["A  within", "E  over", "N  not cut"]
    assert len({cell.colour for cell in found}) == 3


def test_a_shared_cut_names_the_other_panel_and_both_duties():
    first = texts(next(rows.panel_rows(sample_plan())))

    assert first[column(rows.PANEL_COLUMNS, "Shares")] == "S2-A01"
    assert first[3:5] == ["mould of this panel", "mould of S2-A01"]


def test_a_panel_in_strips_has_a_row_for_each():
    sweeps = []
    for strip in (2, 1):
        sweep = sample_sweep(f"SM-S-A01.{strip}", ("S-A01",))
        sweeps.append(replace(sweep, serving=(replace(sweep.serving[0], strip=strip, n_strips=2),)))
    plan = replace(sample_plan(), panels=(sample_panel("S-A01"),), sweeps=tuple(sweeps), pieces=())

    found = list(rows.panel_rows(plan))

    assert [texts(row)[0] for row in found] == ["S-A01, strip 1 of 2", "S-A01, strip 2 of 2"]
    assert [row.key for row in found] == ["S-A01 SM-S-A01.1", "S-A01 SM-S-A01.2"]


def test_the_cut_list_gives_order_place_and_speed_under_a_heading_for_each_set_up():
    plan = sample_plan()
    found = [texts(row) for row in rows.cut_rows(plan, plan.blocks[0])]

    assert found[0] == ["Set-up 1: as laid, part 2500 × 1250 × 700 mm"]
    assert found[5] == ["Set-up 2: turned 90°, part 2470 × 1250 × 670 mm"]
    assert found[6] == ["5", "trim", "y = 13.8 mm", "159", "", "", "2470 × 1250 × 670", "15, 0, 15"]
    assert ["sweep", "SM-S1-A01", "159", "7.8"] in [row[1:5] for row in found]
    assert len([row for row in found if len(row) == 1]) == len({cut.setup for cut in plan.blocks[0].cuts})


def test_the_cut_list_says_what_to_support_and_on_which_face_the_block_stands():
    plan = sample_plan()
    freed = Freed(side="end", at_mm=(1216.2, 15.0, 15.0), size_mm=(1268.8, 1220.0, 670.0))
    cuts = tuple(replace(cut, frees=(freed,)) if cut.order == 7 else cut for cut in plan.blocks[0].cuts)
    block = replace(plan.blocks[0], cuts=cuts, bought_mm=(1250.0, 2500.0, 700.0))

    found = [texts(row) for row in rows.cut_rows(plan, block)]

    assert found[0] == ["First stand the block on its 2500 × 1250 mm face"]
    support = column(rows.CUT_COLUMNS, "Support")
    assert {row[0]: row[support] for row in found if len(row) > 1 and row[support]} == {"7": "at the end"}


def test_a_block_says_how_much_of_it_is_used_and_what_is_left():
    (row,) = rows.block_rows(sample_plan())

    assert texts(row)[4] == f"{100 * 4 * 179.2776 / 2187.5:.1f}"
    assert "1268.8 × 1220 × 670" in texts(row)[-1]


def test_the_account_on_the_screen_adds_up_to_the_foam_bought():
    ledger = sample_plan().ledger
    parts = ledger_parts(ledger)
    found = rows.ledger_rows(parts, ledger)

    assert sum(part.volume_mm3 for part in parts) == pytest.approx(ledger.bought_mm3, rel=1e-9)
    assert texts(found[-1])[1:3] == ["2187.5", "100.00"]
    for group, percent in (("used", ledger.used_percent), ("waste", ledger.waste_percent)):
        assert sum(part.percent for part in parts if part.counts_as == group) == pytest.approx(percent, rel=1e-9)
    assert len({part.letter for part in parts}) == len(parts)
    assert len({(part.colour, part.hatch) for part in parts}) == len(parts)


def test_findings_come_gravest_first_and_keep_their_number():
    findings = tuple(
        Finding(severity=severity, code="c", subject="s", text="t")
        for severity in (Severity.INFO, Severity.ERROR, Severity.WARNING)
    )

    found = list(rows.finding_rows(findings))

    assert [texts(row)[0] for row in found] == ["Error", "Warning", "Note"]
    assert [row.key for row in found] == ["1", "2", "0"]


@example(tolerance=2.0, share=1.0)
@given(tolerance=st.floats(0.05, 20.0), share=st.floats(0.0, 3.0))
def test_a_deviation_is_called_within_exactly_when_it_is_not_over_the_tolerance(tolerance, share):
    deviation = share * tolerance

    assert step_of(deviation, tolerance).is_within == (deviation <= tolerance)


def test_steps_are_told_apart_without_colour_and_say_their_range():
    assert len({step.letter for step in STEPS}) == len(STEPS)
    assert [legend_text(step, 2.0) for step in STEPS] == [
        "0.00 to 0.50 mm",
        "0.50 to 1.00 mm",
        "1.00 to 1.50 mm",
        "1.50 to 2.00 mm",
        "over 2.00 mm",
    ]


def test_the_worst_of_a_panel_is_that_of_its_worst_strip():
    base = sample_sweep("SM-S-A01.1", ("S-A01",))
    sweeps = tuple(
        replace(base, id=f"SM-S-A01.{n}", serving=(replace(base.serving[0], max_mm=worst, strip=n, n_strips=2),))
        for n, worst in ((1, 0.3), (2, 1.7))
    )

    assert worst_by_panel((sample_panel("S-A01"), sample_panel("S-A02")), sweeps) == {"S-A01": 1.7, "S-A02": None}
