"""What a pair is worth, and which ways to share a cut are tried."""

from dataclasses import replace

import numpy as np
import pytest
from kit.conoids import LENGTH, conoid, hypar
from kit.facades import facade
from kit.sample import sample_conditions, sample_job

from cutblock.pairing.edges import HANDLING_LITRES, Attempt, costs_of, find_attempts, reach_of
from cutblock.pairing.match import pair_sweeps
from cutblock.sweeps.shared import fit_shared

EXACT = sample_conditions(kerf_mm=0.0, least_kerf_mm=0.0)


def reach(**changes):
    return reach_of(sample_job(**changes), EXACT, 1.0)


def way(misfit_mm, turn=0):
    return Attempt(misfit_mm, turn, is_own=True, is_shared=True)


def test_partners_may_differ_by_twice_what_one_may_be_off():
    """At 2 mm: wanted faces up to 4 mm apart, if a sheet on their mean keeps both within 2 mm."""
    shapes = facade(np.random.default_rng(7), 60)
    strict = find_attempts(shapes, reach(tolerance_mm=2.0), [True] * 60, may_share=False)
    shared = find_attempts(shapes, reach(tolerance_mm=2.0), [True] * 60, may_share=True)
    twice = find_attempts(shapes, reach(tolerance_mm=4.0), [True] * 60, may_share=False)

    # The sheets of this facade are their wanted surfaces, so the mean strays by half the misfit.
    assert set(strict) < set(shared) == set(twice)
    assert all(attempt.misfit_mm <= 4.0 for ways in shared.values() for attempt in ways)
    assert all(attempt.is_own == (attempt.misfit_mm <= 2.0) for ways in shared.values() for attempt in ways)
    assert not find_attempts(shapes, reach(tolerance_mm=2.0), [False] * 60, may_share=True).keys() - strict.keys()


def test_a_pair_saves_the_smaller_billet_less_its_handling():
    attempts = {(0, 1): [way(0.0)], (0, 2): [way(0.0)], (1, 2): [way(0.0)]}

    costs = costs_of(attempts, [100.0, 60.0, 40.0], reach())

    assert costs[0, 1] == pytest.approx(0.0)
    assert costs[0, 2] == costs[1, 2] == pytest.approx(1.0 - (40.0 - HANDLING_LITRES) / (60.0 - HANDLING_LITRES))


def test_a_pair_that_saves_less_than_its_handling_is_not_made():
    attempts = {(0, 1): [way(0.0)], (0, 2): [way(0.0)], (1, 1): []}

    assert set(costs_of(attempts, [100.0, HANDLING_LITRES, 3.0], reach())) == {(0, 2)}


def test_of_billets_alike_the_closest_faces_cost_least():
    attempts = {(0, 1): [way(0.4)], (0, 2): [way(0.1), way(0.9, 1)], (1, 2): [way(3.9)]}

    costs = costs_of(attempts, [100.0] * 3, reach(tolerance_mm=2.0))

    assert costs[0, 2] < costs[0, 1] < costs[1, 2] < 0.06


def test_billets_that_save_more_are_paired_where_not_all_can_be():
    """B serves the tall A1 or the low A2; only one of them."""
    low, tall, b = conoid("A1", 40.0), conoid("A2", 40.0), conoid("B", 40.0, is_turned=True)
    made = [low, (tall[0], replace(tall[1], height_mm=400.0)), (b[0], replace(b[1], height_mm=500.0))]
    panels, sweeps = zip(*made, strict=True)
    # The three would be one shape and its complement; another bulge of a hundredth of a mm tells A1 and A2 apart.
    other = conoid("A2", 40.1)
    panels = (panels[0], other[0], panels[2])
    sweeps = (sweeps[0], replace(other[1], height_mm=400.0), sweeps[2])

    kept, _, _ = pair_sweeps(sample_job(), panels, sweeps, EXACT)

    assert [sweep.serves for sweep in kept] == [("A1",), ("A2", "B")]


def test_more_pairs_are_taken_before_more_litres():
    """A chain A - B - C - D: the middle pair saves most, the two outer ones are one more."""
    chain = [
        hypar(name, (200.0 + d, 80.0 - d, 220.0 + d, 100.0 - d)) for name, d in zip("ABCD", (0, 3, 6, 9), strict=True)
    ]
    heights = (300.0, 500.0, 500.0, 300.0)
    panels = [panel for panel, _ in chain]
    sweeps = [replace(sweep, height_mm=height) for (_, sweep), height in zip(chain, heights, strict=True)]
    job = sample_job(tolerance_mm=1.6)

    kept, _, _ = pair_sweeps(
        job,
        panels,
        sweeps,
        EXACT,
        fit_shared=lambda couples, progress: fit_shared(job, panels, EXACT, couples, progress),
    )

    assert {frozenset(sweep.serves) for sweep in kept} == {frozenset("AB"), frozenset("CD")}


def test_bench_panels_may_differ_in_size_by_a_quarter_of_their_margin():
    assert reach(margin_mm=30.0).size_mm == 7.5
    assert reach(margin_mm=0.0).size_mm == 0.5
    assert reach(margin_mm=30.0).outline_mm == 7.5
    assert reach(margin_mm=0.0).outline_mm == 1.0
    assert LENGTH == 1200.0


def test_steep_panels_may_differ_more_in_height_than_along_their_normals():
    flat, steep = (reach_of(sample_job(), EXACT, steepest) for steepest in (1.0, 0.5))

    assert steep.heights_mm == 2.0 * flat.heights_mm
    assert steep.mean_mm == 2.0 * flat.mean_mm
