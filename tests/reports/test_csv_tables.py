import csv
import locale
from dataclasses import replace
from io import StringIO

import pytest
from kit.sample import sample_plan

from cutblock.flow.outputs import block_ledgers
from cutblock.flow.plan_json import plan_text
from cutblock.flow.plan_read import read_plan_text
from cutblock.reports.csv_tables import blocks_csv, pieces_csv


def rows(text):
    return list(csv.reader(StringIO(text, newline="")))


def test_every_piece_has_its_row_under_headings_with_units():
    plan = sample_plan()

    heading, *body = rows(pieces_csv(plan))

    assert {"litres", "mass kg", "billet length mm", "speed mm/min"} <= set(heading)
    assert [row[0] for row in body] == [piece.id for piece in plan.pieces]
    assert body[0][heading.index("litres")] == "179.278"


@pytest.mark.parametrize(
    ("unit", "centre", "cells"),
    [
        ("mm", (601.25, 500.0, 74.54), ["601.2", "500.0", "74.5"]),
        ("in", (25.4, 254.0, 12.7), ["1.000", "10.000", "0.500"]),
        ("m", (601.28, 500.0, -1e-9), ["0.6013", "0.5000", "0.0000"]),
        ("mm", None, ["", "", ""]),
    ],
)
def test_the_centre_of_mass_stands_in_the_unit_people_read(unit, centre, cells):
    plan = sample_plan()
    plan = replace(
        plan,
        job=replace(plan.job, units=unit),
        pieces=(replace(plan.pieces[0], centre_mm=centre), *plan.pieces[1:]),
    )

    heading, first, *_ = rows(pieces_csv(plan))

    assert heading[-3:] == [f"centre x {unit}", f"centre y {unit}", f"centre z {unit}"]
    assert first[-3:] == cells


def test_the_boxes_that_come_out_of_a_filler_stand_in_its_row():
    plan = sample_plan()
    plan = replace(plan, pieces=(plan.pieces[0], replace(plan.pieces[1], filler="9 x kerb"), *plan.pieces[2:]))

    heading, first, second, *_ = csv.reader(StringIO(pieces_csv(plan)))

    assert (first[heading.index("boxes")], second[heading.index("boxes")]) == ("", "9 x kerb")


def test_a_centre_on_the_edge_of_rounding_reads_the_same_from_the_plan_and_from_its_file():
    """469.25 less a rounding error would print 469.2, and read again from six digits 469.3 or 469.2."""
    plan = sample_plan()
    exact, noisy = (
        replace(plan, pieces=(replace(plan.pieces[0], centre_mm=(value, 500.0, 75.0)), *plan.pieces[1:]))
        for value in (469.35, 469.35 - 2e-10)
    )

    assert pieces_csv(noisy) == pieces_csv(exact)
    assert pieces_csv(read_plan_text(plan_text(noisy).encode(), "plan.json")) == pieces_csv(noisy)


@pytest.mark.parametrize(
    ("mass_kg", "length_mm", "persons"), [(3.0, 1200.0, "1"), (26.0, 1200.0, "2"), (3.0, 1600.0, "2")]
)
def test_a_piece_too_heavy_or_too_long_for_one_person_says_so(mass_kg, length_mm, persons):
    """Common practice, no source: 20 kg, or 1.5 m of length; the tags say the same."""
    plan = sample_plan()
    sweeps = (replace(plan.sweeps[0], length_mm=length_mm), *plan.sweeps[1:])
    plan = replace(plan, sweeps=sweeps, pieces=(replace(plan.pieces[0], mass_kg=mass_kg), *plan.pieces[1:]))

    heading, first, *_ = rows(pieces_csv(plan))

    assert first[heading.index("persons to lift")] == persons


def test_the_litres_of_a_block_sum_to_what_was_bought():
    plan = sample_plan()

    heading, row = rows(blocks_csv(plan, block_ledgers(plan)))

    litres = {name: float(value) for name, value in zip(heading, row, strict=True) if name.endswith(" litres")}
    bought = litres.pop("bought litres")
    assert sum(round(1000 * value) for value in litres.values()) == round(1000 * bought)


@pytest.mark.parametrize("name", ["=1+1", "+SUM(A1)", "-2+3", "-2", "@cmd", "\tx", "\r=1"])
def test_a_name_cannot_become_a_formula(name):
    """CWE-1236: spreadsheets run cells that start with = + - @ tab or return."""
    plan = sample_plan()
    pieces = (replace(plan.pieces[0], panel=name, block=name),)
    job = replace(plan.job, currency=name)
    block = replace(plan.blocks[0], grade=name)
    plan = replace(plan, pieces=pieces)

    cells = rows(pieces_csv(plan))[1]
    heading, cell = rows(blocks_csv(replace(plan, job=job, blocks=(block,)), block_ledgers(sample_plan())))

    assert cells[5] == cells[6] == cell[1] == f"'{name}"
    assert heading[-1] == f"price {name}".rstrip()


def test_numbers_stay_numbers():
    plan = sample_plan()
    pieces = (replace(plan.pieces[0], mass_kg=-0.25),)

    assert rows(pieces_csv(replace(plan, pieces=pieces)))[1][8] == "-0.250"


@pytest.mark.parametrize("name", ['north, "wet" side', "two\nlines", "two\r\nlines", "Größe", "'quoted'"])
def test_texts_come_back_whole(name):
    plan = sample_plan()

    cell = rows(pieces_csv(replace(plan, pieces=(replace(plan.pieces[0], panel=name),))))[1][5]

    assert cell == name


def test_every_row_ends_as_the_standard_says_and_has_a_cell_for_each_heading():
    """RFC 4180: CRLF after every row, the same number of fields in each."""
    plan = sample_plan()
    for text in (pieces_csv(plan), blocks_csv(plan, block_ledgers(plan))):
        assert text.endswith("\r\n")
        assert text.count("\n") == text.count("\r\n")
        assert len({len(row) for row in rows(text)}) == 1


def test_a_block_has_its_sizes_hours_and_price_in_named_units():
    plan = sample_plan()

    heading, row = rows(blocks_csv(plan, block_ledgers(plan)))
    cells = dict(zip(heading, row, strict=True))

    assert (cells["length mm"], cells["width mm"], cells["height mm"]) == ("2500.0", "1250.0", "700.0")
    assert (cells["billets"], cells["hours"], cells["price EUR"], cells["from offcut"]) == (
        "2",
        "1.300",
        "150.00",
        "no",
    )


def test_numbers_have_a_point_whatever_the_language_of_the_machine():
    known = locale.setlocale(locale.LC_ALL)
    plan = sample_plan()
    wanted = pieces_csv(plan)
    for name in ("de_DE.UTF-8", "fr_FR.UTF-8"):
        try:
            locale.setlocale(locale.LC_ALL, name)
        except locale.Error:
            continue
        try:
            assert pieces_csv(plan) == wanted
        finally:
            locale.setlocale(locale.LC_ALL, known)
    assert ",179.278," in wanted
