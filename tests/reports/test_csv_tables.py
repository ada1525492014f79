import csv
from dataclasses import replace
from io import StringIO

import pytest
from kit.sample import sample_plan

from cutblock.flow.outputs import block_ledgers
from cutblock.reports.csv_tables import blocks_csv, pieces_csv


def rows(text):
    return list(csv.reader(StringIO(text, newline="")))


def test_every_piece_has_its_row_under_headings_with_units():
    plan = sample_plan()

    heading, *body = rows(pieces_csv(plan))

    assert {"litres", "mass kg", "billet length mm", "speed mm/min"} <= set(heading)
    assert [row[0] for row in body] == [piece.id for piece in plan.pieces]
    assert body[0][heading.index("litres")] == "179.278"


def test_the_litres_of_a_block_sum_to_what_was_bought():
    plan = sample_plan()

    heading, row = rows(blocks_csv(plan, block_ledgers(plan)))

    litres = {name: float(value) for name, value in zip(heading, row, strict=True) if name.endswith(" litres")}
    bought = litres.pop("bought litres")
    assert sum(litres.values()) == pytest.approx(bought, abs=0.01)


@pytest.mark.parametrize("name", ["=1+1", "+SUM(A1)", "-2+3", "@cmd", "\tx", "\r=1"])
def test_a_name_cannot_become_a_formula(name):
    """CWE-1236: spreadsheets run cells that start with = + - @ tab or return."""
    plan = sample_plan()
    pieces = (replace(plan.pieces[0], panel=name),)

    cell = rows(pieces_csv(replace(plan, pieces=pieces)))[1][5]

    assert cell == f"'{name}"


def test_commas_and_quotes_come_back_whole():
    plan = sample_plan()
    odd = 'north, "wet" side'

    cell = rows(pieces_csv(replace(plan, pieces=(replace(plan.pieces[0], panel=odd),))))[1][5]

    assert cell == odd
