"""Measure the search for partners and what cuts on the mean of two faces bring; run by hand.

    python tests/benchmarks/bench_pairing.py

Prints how long the search among 10,000 panels takes, whether that among 2,000 finds what trying all of them finds, how
long a matching of many repeated shapes takes, and how many panels of a free-form facade pair strictly and with shared
cuts at several tolerances.
"""

import sys
import time
from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from kit.facades import by_brute_force, facade
from kit.scenario_data import SCENARIOS

import cutblock
from cutblock.base.progress import silent
from cutblock.flow import steps
from cutblock.flow.chain import start_plan
from cutblock.pairing.match import pair_sweeps
from cutblock.pairing.matching import match_shapes
from cutblock.pairing.shapes import find_candidates
from cutblock.records.plan import Settings
from cutblock.sweeps.shared import fit_shared


def show(line):
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def timed(call):
    began, cpu = time.perf_counter(), time.process_time()
    result = call()
    return result, time.perf_counter() - began, time.process_time() - cpu


def searches():
    shapes = facade(np.random.default_rng(1), 10_000)
    for _ in range(3):
        found, took, cpu = timed(lambda: find_candidates(shapes, 1.0))
        show(f"10,000 panels: {len(found)} candidates in {took:.2f} s ({cpu:.2f} s of one core)")
    shapes = facade(np.random.default_rng(2), 2_000)
    found, took, _ = timed(lambda: {candidate[:3] for candidate in find_candidates(shapes, 1.0)})
    tried, whole, _ = timed(lambda: by_brute_force(shapes, 1.0))
    same = "the same as" if found == tried else f"{len(found ^ tried)} other than"
    show(f"2,000 panels: {len(found)} candidates in {took:.2f} s, {same} trying all of them in {whole:.1f} s")


def matchings():
    counts = [333] * 30
    edges = {(k, k + 1): 0.5 for k in range(0, 28, 2)} | {(28, 28): 0.1, (29, 29): 0.1}
    pairs, took, _ = timed(lambda: match_shapes(counts, edges))
    show(f"{sum(counts)} panels of 30 shapes: {sum(pairs.values())} pairs in {1e3 * took:.0f} ms")


def facades():
    plan = start_plan(cutblock.read_job(SCENARIOS / "valley-roof" / "job.toml"), Settings())
    for step in (steps.take_form, steps.divide):
        plan = step(plan, silent)
    for tolerance in (1.5, 2.0, 3.0):
        plan = replace(plan, job=replace(plan.job, tolerance_mm=tolerance), sweeps=())
        fitted = steps.fit(plan, silent)
        both = partial(fit_shared, fitted.job, fitted.panels, fitted.conditions)
        counts = []
        known = (fitted.job, fitted.panels, fitted.sweeps, fitted.conditions)
        for fit in (None, both):
            (sweeps, _, _), took, _ = timed(partial(pair_sweeps, *known, fit_shared=fit))
            counts.append(2 * sum(len(sweep.serving) == 2 for sweep in sweeps))
        show(
            f"valley roof at {tolerance:g} mm: {counts[0]} of 100 panels pair strictly, {counts[1]} with shared cuts "
            f"({took:.1f} s)"
        )


if __name__ == "__main__":
    searches()
    matchings()
    facades()
