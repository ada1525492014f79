import csv
import io
import json
from dataclasses import replace
from xml.etree import ElementTree as ET

import pytest
from kit.height_jobs import job_over

import cutblock
from cutblock.base.errors import Cancelled
from cutblock.cli.main import main
from cutblock.flow.curve import waste_curves
from cutblock.reports.curves import curves_csv, curves_drawing


@pytest.fixture(scope="module")
def job(tmp_path_factory):
    """A domed shell of four panels: strips and waste depend on the tolerance."""
    folder = tmp_path_factory.mktemp("curve")
    return cutblock.read_job(job_over(folder, lambda x, y: -(x**2 + y**2) / 14000.0, (1600.0, 1200.0), tolerance=2.0))


TOLERANCES, SIZES = (0.5, 1.0, 2.0), (0.6, 0.95, 1.0, 1.25)  # fewer than the command's: quicker


@pytest.fixture(scope="module", autouse=True)
def few():
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("cutblock.flow.curve.TOLERANCES", TOLERANCES)
        patch.setattr("cutblock.flow.curve.SIZES", SIZES)
        yield


@pytest.fixture(scope="module")
def curves(job, few):
    return waste_curves(job)


def test_the_job_as_it_stands_has_the_numbers_of_its_plan(job, curves):
    plan = cutblock.make_plan(job)

    for series in (curves.by_tolerance, curves.by_size):
        (here,) = [point for point in series if point.is_job]
        assert (here.n_panels, here.n_sweeps, here.n_blocks) == (len(plan.panels), len(plan.sweeps), len(plan.blocks))
        assert here.used_percent == pytest.approx(plan.ledger.used_percent, rel=1e-12)
        assert here.waste_percent == pytest.approx(plan.ledger.waste_percent, rel=1e-12)
        assert here.hours_s == pytest.approx(plan.hours.total_s, rel=1e-12)
        assert here.cost == plan.cost.total


def test_tolerances_rise_and_cells_grow(job, curves):
    assert [point.tolerance_mm for point in curves.by_tolerance] == [share * job.tolerance_mm for share in TOLERANCES]
    lengths = [point.cell_mm[0] for point in curves.by_size]
    assert lengths == sorted(set(lengths))
    assert len(lengths) == len(SIZES) - 1
    assert len({point.n_panels for point in curves.by_size}) == len(lengths)  # sizes that divide alike are told once


def test_a_wider_tolerance_never_needs_more_sweeps_on_a_domed_face(curves):
    sweeps = [point.n_sweeps for point in curves.by_tolerance if not point.refusal]
    assert sweeps == sorted(sweeps, reverse=True)
    assert sweeps[0] > sweeps[-1]


def test_a_plan_that_cannot_be_made_is_told_with_its_reason(job):
    small = replace(job.stock[0], length_mm=1000.0, width_mm=1000.0)
    found = waste_curves(replace(job, stock=(small,)))

    *fitting, largest = found.by_size
    assert all(not point.refusal and point.n_blocks for point in fitting)
    assert "block" in largest.refusal
    assert (largest.n_blocks, largest.n_uncut) == (0, largest.n_panels)


def test_comparing_can_be_stopped(job):
    def stop(fraction, text):
        assert 0.0 <= fraction <= 1.0
        if fraction > 0.3:
            raise Cancelled

    with pytest.raises(Cancelled):
        waste_curves(job, progress=stop)


def test_the_command_prints_writes_and_draws_the_same(job, curves, tmp_path, capsys, monkeypatch):
    monkeypatch.setattr("cutblock.flow.curve.waste_curves", lambda *_: curves)
    out = tmp_path / "curve"

    assert main(["plan", job.path, "--curve", "--out", str(out)]) == 0
    table = capsys.readouterr().out
    assert main(["plan", job.path, "--curve", "--json"]) == 0
    told = json.loads(capsys.readouterr().out)

    assert table.count("*") == 3  # the job in each table, and the word on the sign
    assert [entry["n_sweeps"] for entry in told["by_tolerance"]] == [point.n_sweeps for point in curves.by_tolerance]
    rows = list(csv.DictReader(io.StringIO((out / "curve.csv").read_text())))
    assert [row["panels"] for row in rows if row["series"] == "size"] == [str(one.n_panels) for one in curves.by_size]
    ET.fromstring((out / "curve.svg").read_text())
    assert {path.name for path in out.iterdir()} == {"curve.csv", "curve.svg"}


def test_a_folder_that_cannot_be_made_is_refused(job, curves, tmp_path, capsys, monkeypatch):
    monkeypatch.setattr("cutblock.flow.curve.waste_curves", lambda *_: curves)

    assert main(["plan", job.path, "--curve", "--out", str(tmp_path / "no" / "such")]) == 2
    assert "cannot be made" in capsys.readouterr().err


def test_refused_plans_leave_gaps_in_table_and_chart(curves):
    gone = replace(curves.by_tolerance[0], refusal="no block is large enough")
    some = replace(curves, by_tolerance=(gone, *curves.by_tolerance[1:]))

    whole, parted = curves_drawing(curves, "mm"), curves_drawing(some, "mm")

    assert len(parted.marks) == len(whole.marks) - 4  # a line and a square of each curve
    assert "no block is large enough" in curves_csv(some, "mm").splitlines()[1]
