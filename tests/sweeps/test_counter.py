import numpy as np
import pytest
from kit.sample import sample_conditions, sample_job, sample_pieces, sample_sweep
from kit.shapes import helicoid, hypar, panel_of

from cutblock.records.words import Duty, Severity
from cutblock.sweeps.counter import counter_mould_findings, offset_deviation

CONDITIONS = sample_conditions()


def found(height, duty=Duty.COUNTER_MOULD, **changes):
    panel = panel_of(height)
    sweep = sample_sweep(panels=("S-A01",))
    pieces = sample_pieces(sweep, duty)
    return counter_mould_findings(sample_job(**changes), [panel], [sweep], pieces, CONDITIONS)


def test_a_lift_that_keeps_the_tolerance_is_told_with_the_thickness_and_the_place():
    (finding,) = found(lambda x, y: 0.2 * x)
    # 30 mm on a slope of 0.2: 29.4 mm.
    assert (finding.code, finding.severity) == ("counter-mould-by-lift", Severity.INFO)
    assert finding.subject == "SM-S1-A01-U"
    assert finding.text.startswith("A counter-mould lifted 30 mm leaves the concrete 29.4 mm thick at its steepest")


def test_the_steepest_place_is_a_corner_of_the_hypar():
    (finding,) = found(hypar)
    least = 30.0 / np.sqrt(1.0 + 0.2**2 + 0.24**2)
    assert f"{least:.1f} mm thick" in finding.text
    assert any(f"(x {x} mm, y {y} mm" in finding.text for x in (0, 1200) for y in (0, 1000))


def test_a_lift_that_loses_too_much_is_told_beside_what_a_second_sweep_would_do():
    (finding,) = found(lambda x, y: 0.5 * x)
    assert (finding.code, finding.severity) == ("counter-mould-thin", Severity.WARNING)
    assert "26.8 mm thick" in finding.text
    assert "more than the tolerance of 2 mm thinner; 1 of 1 are like this" in finding.text
    assert "A true offset by a second sweep would be within 0 mm, but takes a second billet." in finding.text


def test_only_counter_moulds_are_looked_at():
    assert found(lambda x, y: 0.5 * x, Duty.CRADLE) == ()


def test_the_offset_of_a_ruled_form_by_30_mm_is_cut_to_a_twentieth_of_a_mm():
    """A helicoid of 40 degrees in 1.2 m, offset by 30 mm, is met within 0.05 mm by a fitted sweep."""
    panel = panel_of(helicoid)
    assert offset_deviation(sample_job(thickness_mm=30.0, tolerance_mm=0.2), panel, CONDITIONS) < 0.05


def test_a_form_that_bends_more_sharply_than_the_thickness_has_no_offset():
    (finding,) = found(lambda x, y: -250.0 * np.cos(x / 100.0), thickness_mm=60.0)
    assert "bends too sharply" in finding.text


@pytest.mark.parametrize("tolerance", [0.5, 0.6])
def test_lifting_is_taken_up_to_the_tolerance(tolerance):
    # 30 (1 - cos theta) = 0.583 mm on a slope of 0.2.
    (finding,) = found(lambda x, y: 0.2 * x, tolerance_mm=tolerance)
    assert finding.code == ("counter-mould-by-lift" if tolerance > 0.583 else "counter-mould-thin")
