"""Plans and a machine with room enough that every cut of them can be made."""

from dataclasses import replace

import numpy as np
from kit.sample import sample_machine, sample_plan, sample_sweep

from cutblock.records.block import Block, Cut, PlacedBillet
from cutblock.records.sweep import SweepTiming
from cutblock.records.words import CutKind


def roomy_machine(**changes):
    """The sample machine, wider and with its table high enough for steep rulings."""
    values = {"span_mm": 3000.0, "table_height_mm": 400.0, "lift_mm": 1700.0, "longest_wire_mm": 3300.0}
    return sample_machine(**(values | changes))


def roomy_plan(**changes):
    """The sample plan on the roomy machine."""
    return replace(sample_plan(), **({"machine": roomy_machine()} | changes))


def skew_sweep(sweep_id="SM-K-A01", n_rulings=12, size_mm=(900.0, 700.0, 250.0), seed=1):
    """A sweep whose rails differ in x as well as in z."""
    length, width, height = size_mm
    random = np.random.default_rng(seed)
    share = np.linspace(0.0, 1.0, n_rulings)
    x = -25.0 + share * (length + 50.0)
    skew = 8.0 * np.sin(np.pi * share)
    near_z = height / 2 + 30.0 * np.sin(5.0 * share + random.uniform(0.0, 6.0))
    far_z = height / 2 + 30.0 * np.cos(4.0 * share + random.uniform(0.0, 6.0))
    return sample_sweep(
        sweep_id,
        ("T-A01",),
        length_mm=length,
        width_mm=width,
        height_mm=height,
        near=np.stack([x - skew, near_z], axis=1),
        far=np.stack([x + skew, far_z], axis=1),
        skew_mm=16.0,
    )


def timing_of(sweep, speed_mm_s=2.5):
    steps = np.hypot(*np.diff((sweep.near + sweep.far) / 2, axis=0).T) / speed_mm_s
    return SweepTiming(
        sweep=sweep.id,
        low_mm_s=1.5,
        high_mm_s=3.6,
        planned_mm_s=speed_mm_s,
        seconds=float(steps.sum()),
        step_seconds=steps,
        end_speed_ratio=1.1,
        twist_deg_per_m=5.0,
    )


def cut(order, setup, at_mm, size_mm, axis="", position=0.0, *, kind=CutKind.THROUGH, turn=False, sweep=None):
    return Cut(
        order=order,
        kind=kind,
        setup=setup,
        part_at_mm=at_mm,
        part_size_mm=size_mm,
        axis=axis,
        at_mm=position,
        turn=turn,
        sweep=sweep,
    )


def block_of(cuts, billets=(), block_id="SM-B01", size_mm=(2500.0, 1250.0, 700.0)):
    return Block(
        id=block_id,
        length_mm=size_mm[0],
        width_mm=size_mm[1],
        height_mm=size_mm[2],
        grade="EPS 100",
        skin_mm=15.0,
        kerf_mm=1.2,
        billets=tuple(billets),
        cuts=tuple(cuts),
        offcuts=(),
        price=150.0,
    )


def billet_plan(sweep, *, turned=False, at_mm=(40.0, 55.0, 70.0), **changes):
    """A plan of one block whose only cut is the sweep of one billet."""
    length, width, height = sweep.length_mm, sweep.width_mm, sweep.height_mm
    size = (width, length, height) if turned else (length, width, height)
    placed = PlacedBillet(sweep=sweep.id, at_mm=at_mm, size_mm=size, turned=turned)
    only = cut(1, 1, at_mm, size, kind=CutKind.SWEEP, turn=turned, sweep=sweep.id)
    values = {"sweeps": (sweep,), "timings": (timing_of(sweep),), "blocks": (block_of([only], [placed]),)}
    return roomy_plan(**(values | changes))


def cuts_plan(*cuts, **changes):
    """A plan of one block with these cuts."""
    return roomy_plan(blocks=(block_of(cuts),), **changes)


def moves_of(text, axes="XYUV"):
    """Return (n, 4) positions and (n,) seconds of the timed moves of a program, read with nothing of the program."""
    rows = [line[3:].split() for line in text.splitlines() if line.startswith("G1 ")]
    positions = np.array([[float(word[1:]) for word in row[:4]] for row in rows])
    assert all("".join(word[0] for word in row) == axes + "F" for row in rows)
    return positions, 60.0 / np.array([float(row[4][1:]) for row in rows])
