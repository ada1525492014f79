"""A small whole plan made by hand: two equal hypar panels, one shared sweep, one odd panel, one block."""

import numpy as np

from cutblock.records.account import Cost, Hours, Ledger
from cutblock.records.block import Block, Cut, Offcut, PlacedBillet
from cutblock.records.job import CornersSource, FaceSpec, Job, StockSpec
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding, Plan, Settings
from cutblock.records.shop import Conditions, Machine, Wire
from cutblock.records.sweep import Serving, Sweep, SweepTiming, SweepVolumes
from cutblock.records.words import CutKind, Duty, Favour, Half, Layup, Severity

LENGTH, WIDTH, HEIGHT = 1200.0, 1000.0, 300.0
RELIEF = 60.0  # corners of the hypar stand this far above and below its middle
TURN_ABOUT_X = np.diag([1.0, -1.0, -1.0])


def sample_job(**changes):
    corners = np.array([[0, 0, 210], [1200, 0, 90], [1200, 1000, 210], [0, 1000, 90]], dtype=float)
    values = {
        "id": "SM",
        "title": "Sample wall",
        "units": "mm",
        "revision": "A",
        "path": "/nowhere/job.toml",
        "layup": Layup.BED,
        "tolerance_mm": 2.0,
        "coat_mm": 0.0,
        "margin_mm": 0.0,
        "faces": (
            FaceSpec(
                name="S",
                source=CornersSource(corners_mm=corners),
                place="job.toml:12",
                cell_mm=(1200.0, 1000.0),
                count=2,
            ),
        ),
        "grade": "EPS 100",
        "density_kg_m3": 20.0,
        "stock": (
            StockSpec(
                length_mm=2500.0,
                width_mm=1250.0,
                height_mm=700.0,
                skin_mm=15.0,
                grade="EPS 100",
                place="job.toml:20",
                price=150.0,
            ),
        ),
        "least_offcut_mm": (300.0, 300.0, 100.0),
        "machine": "four-axis-2600",
        "wire": "NiCr80 0.40",
        "power_w_m": 60.0,
        "kerf_mm": 1.2,
        "wall_mm": 60.0,
        "favour": Favour.SHARE,
        "unpaired": Duty.COUNTER_MOULD,
        "thickness_mm": 30.0,
        "currency": "EUR",
        "inputs": (("job.toml", "0" * 64),),
    }
    return Job(**(values | changes))


def sample_wire():
    return Wire(
        name="NiCr80 0.40",
        alloy="NiCr80",
        diameter_mm=0.4,
        resistivity_ohm_m=1.08e-6,
        density_kg_m3=8410.0,
        clearance_mm=0.2,
    )


def sample_machine(**changes):
    values = {
        "name": "four-axis-2600",
        "title": "Four-axis cutter, 2.6 m between the towers",
        "travel_mm": 3200.0,
        "lift_mm": 1300.0,
        "span_mm": 2600.0,
        "near_gap_mm": 200.0,
        "table_offset_mm": 300.0,
        "table_height_mm": 50.0,
        "speed_mm_s": 60.0,
        "acceleration_mm_s2": 200.0,
        "air_speed_mm_s": 40.0,
        "longest_wire_mm": 2900.0,
        "setup_s": 240.0,
        "turn_s": 180.0,
        "axes": ("X", "Y", "U", "V"),
        "decimals": 3,
        "header": ("G21", "G90", "G61"),
        "footer": ("M2",),
        "heater_on": "M3 S{power}",
        "heater_off": "M5",
    }
    return Machine(**(values | changes))


def sample_conditions(**changes):
    values = {
        "density_kg_m3": 20.0,
        "power_w_m": 60.0,
        "kerf_rate_mm2_s": 2.9104,
        "least_kerf_mm": 0.1,
        "low_mm_s": 1.532,
        "high_mm_s": 3.638,
        "planned_mm_s": 2.6458,
        "kerf_mm": 1.2,
        "widest_kerf_mm": 2.0,
    }
    return Conditions(**(values | changes))


def sample_panel(panel_id="S1-A01", copy=1, **changes):
    x = np.linspace(0.0, LENGTH, 25)
    y = np.linspace(0.0, WIDTH, 21)
    bilinear = np.outer(2 * x / LENGTH - 1, 2 * y / WIDTH - 1)
    heights = 150.0 + RELIEF * bilinear
    slope_x = np.outer(np.full(25, 2 / LENGTH), 2 * y / WIDTH - 1) * RELIEF
    slope_y = np.outer(2 * x / LENGTH - 1, np.full(21, 2 / WIDTH)) * RELIEF
    normals = np.stack([-slope_x, -slope_y, np.ones_like(heights)], axis=-1)
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    points = np.stack([*np.meshgrid(x, y, indexing="ij"), heights], axis=-1)
    values = {
        "id": panel_id,
        "face": "S",
        "copy": copy,
        "row": 1,
        "column": 1,
        "length_mm": LENGTH,
        "width_mm": WIDTH,
        "origin_mm": np.zeros(3),
        "axes": np.eye(3),
        "outline": (np.array([[0, 0], [LENGTH, 0], [LENGTH, WIDTH], [0, WIDTH]]),),
        "is_rectangle": True,
        "heights_mm": heights,
        "samples_mm": points.reshape(-1, 3),
        "normals": normals.reshape(-1, 3),
        "areas_mm2": np.full(heights.size, LENGTH * WIDTH / heights.size),
    }
    return Panel(**(values | changes))


def sample_sweep(sweep_id="SM-S1-A01", panels=("S1-A01", "S2-A01"), **changes):
    x = np.linspace(-20.0, LENGTH + 20.0, 63)
    ramp = RELIEF * (2 * x / LENGTH - 1)
    lower = Serving(
        panel=panels[0], half=Half.LOWER, rotation=np.eye(3), shift_mm=np.zeros(3), max_mm=0.6, rms_mm=0.6, p95_mm=0.6
    )
    serving = [lower]
    if len(panels) > 1:
        serving.append(
            Serving(
                panel=panels[1],
                half=Half.UPPER,
                rotation=TURN_ABOUT_X,
                shift_mm=np.array([0.0, WIDTH, HEIGHT]),
                max_mm=0.6,
                rms_mm=0.6,
                p95_mm=0.6,
            )
        )
    values = {
        "id": sweep_id,
        "length_mm": LENGTH,
        "width_mm": WIDTH,
        "height_mm": HEIGHT,
        "near": np.stack([x, 150.0 - ramp], axis=1),
        "far": np.stack([x, 150.0 + ramp], axis=1),
        "wire_along": "y",
        "serving": tuple(serving),
        "kerf_mm": (1.2, 1.2),
        "fit_max_mm": 1e-9,
        "fit_rms_mm": 1e-10,
    }
    return Sweep(**(values | changes))


def sample_pieces(sweep, duty_upper=Duty.MOULD):
    stem = sweep.id
    panels = sweep.serves
    upper_panel = panels[1] if len(panels) > 1 else panels[0]
    shared = {"sweep": stem, "block": "SM-B01", "volume_mm3": 179_277_600.0, "mass_kg": 3.585552}
    return (
        Piece(
            id=f"{stem}-L",
            partner=f"{stem}-U",
            half=Half.LOWER,
            duty=Duty.MOULD,
            code=f"CB1:{stem}-L:A:0000",
            panel=panels[0],
            **shared,
        ),
        Piece(
            id=f"{stem}-U",
            partner=f"{stem}-L",
            half=Half.UPPER,
            duty=duty_upper,
            code=f"CB1:{stem}-U:A:0000",
            panel=upper_panel,
            **shared,
        ),
    )


def sample_block():
    """Two billets one above the other at the start of a 2500 x 1250 x 700 block, skin 15, kerf 1.2."""
    usable_at, usable = (15.0, 15.0, 15.0), (2470.0, 1220.0, 670.0)
    cuts = []

    def cut(kind, setup, at, size, axis, position, turn=False, sweep=None):
        cuts.append(
            Cut(
                order=len(cuts) + 1,
                kind=kind,
                setup=setup,
                part_at_mm=at,
                part_size_mm=size,
                axis=axis,
                at_mm=position,
                turn=turn,
                sweep=sweep,
            )
        )

    # Six trims: the wire melts the inner kerf of each 15 mm skin.
    cut(CutKind.TRIM, 1, (0.0, 0.0, 0.0), (2500.0, 1250.0, 700.0), "x", 13.8)
    cut(CutKind.TRIM, 1, (15.0, 0.0, 0.0), (2485.0, 1250.0, 700.0), "x", 2485.0)
    cut(CutKind.TRIM, 1, (15.0, 0.0, 0.0), (2470.0, 1250.0, 700.0), "z", 13.8)
    cut(CutKind.TRIM, 1, (15.0, 0.0, 15.0), (2470.0, 1250.0, 685.0), "z", 685.0)
    cut(CutKind.TRIM, 2, (15.0, 0.0, 15.0), (2470.0, 1250.0, 670.0), "y", 13.8, turn=True)
    cut(CutKind.TRIM, 2, (15.0, 15.0, 15.0), (2470.0, 1235.0, 670.0), "y", 1235.0, turn=True)
    cut(CutKind.THROUGH, 3, usable_at, usable, "x", 1215.0)
    cut(CutKind.THROUGH, 4, usable_at, (1200.0, 1220.0, 670.0), "y", 1015.0, turn=True)
    cut(CutKind.THROUGH, 5, usable_at, (1200.0, 1000.0, 670.0), "z", 315.0)
    cut(CutKind.THROUGH, 5, (15.0, 15.0, 316.2), (1200.0, 1000.0, 368.8), "z", 616.2)
    cut(CutKind.SWEEP, 6, usable_at, (LENGTH, WIDTH, HEIGHT), "", 0.0, sweep="SM-S1-A01")
    cut(CutKind.SWEEP, 7, (15.0, 15.0, 316.2), (LENGTH, WIDTH, HEIGHT), "", 0.0, sweep="SM-T-A01")
    return Block(
        id="SM-B01",
        length_mm=2500.0,
        width_mm=1250.0,
        height_mm=700.0,
        grade="EPS 100",
        skin_mm=15.0,
        kerf_mm=1.2,
        billets=(
            PlacedBillet(sweep="SM-S1-A01", at_mm=usable_at, size_mm=(LENGTH, WIDTH, HEIGHT), turned=False),
            PlacedBillet(sweep="SM-T-A01", at_mm=(15.0, 15.0, 316.2), size_mm=(LENGTH, WIDTH, HEIGHT), turned=False),
        ),
        cuts=tuple(cuts),
        offcuts=(Offcut(size_mm=(1268.8, 1220.0, 670.0), at_mm=(1216.2, 15.0, 15.0)),),
        price=150.0,
    )


def sample_plan():
    job = sample_job()
    paired = sample_sweep()
    single = sample_sweep("SM-T-A01", ("T-A01",))
    pieces = sample_pieces(paired) + sample_pieces(single, Duty.COUNTER_MOULD)
    volumes = tuple(
        SweepVolumes(
            sweep=s.id, lower_mm3=179_277_600.0, upper_mm3=179_277_600.0, kerf_mm3=1_444_800.0, face_mm2=1_204_000.0
        )
        for s in (paired, single)
    )
    timings = tuple(
        SweepTiming(
            sweep=s.id,
            low_mm_s=1.532,
            high_mm_s=3.638,
            planned_mm_s=2.6458,
            seconds=468.7,
            step_seconds=np.full(62, 468.7 / 62),
            end_speed_ratio=1.0,
            twist_deg_per_m=11.4,
        )
        for s in (paired, single)
    )
    bought = 2500.0 * 1250.0 * 700.0
    parts = {
        "trim_mm3": 168_502_000.0,
        "kerf_mm3": 2 * 1_444_800.0 + 5_000_000.0,
        "mould_mm3": 3 * 179_277_600.0,
        "counter_mould_mm3": 179_277_600.0,
        "cradle_mm3": 0.0,
        "filler_mm3": 0.0,
        "surplus_mm3": 0.0,
        "offcut_mm3": 1268.8 * 1220.0 * 670.0,
    }
    ledger = Ledger(bought_mm3=bought, scrap_mm3=bought - sum(parts.values()), n_blocks=1, n_blocks_bound=1, **parts)
    return Plan(
        job=job,
        settings=Settings(),
        wire=sample_wire(),
        machine=sample_machine(),
        conditions=sample_conditions(),
        panels=(sample_panel(), sample_panel("S2-A01", 2), sample_panel("T-A01", face="T")),
        sweeps=(paired, single),
        pieces=pieces,
        volumes=volumes,
        timings=timings,
        blocks=(sample_block(),),
        n_blocks_bound=1,
        bound_proof="volume",
        ledger=ledger,
        hours=Hours(cutting_s=3000.0, setup_s=1680.0, by_block_s=(("SM-B01", 4680.0),)),
        cost=Cost(currency="EUR", foam=150.0, machine=None, foam_bound=150.0),
        findings=(
            Finding(
                severity=Severity.WARNING,
                code="counter-mould-by-lift",
                subject="SM-T-A01-U",
                text="Lifted 30 mm; the concrete is 29.4 mm thick at the steepest place.",
            ),
        ),
    )
