"""Reads plan.json back into a plan.

What is not in the file (the faces and the panels' samples) stays empty: enough for tags, checks and the window.
"""

from typing import Any

import msgspec
import numpy as np

from cutblock.base.errors import InputError
from cutblock.base.units import MM3_PER_LITRE, SECONDS_PER_HOUR
from cutblock.flow import plan_schema as schema
from cutblock.records.account import Cost, Hours, Ledger
from cutblock.records.block import Block, Cut, Freed, Offcut, PlacedBillet
from cutblock.records.deviation import FaceBend, PanelDeviation
from cutblock.records.job import Job, Pin, StockSpec
from cutblock.records.panel import Panel, PanelEdge
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding, Plan, Settings
from cutblock.records.shop import Calibration, Conditions, Machine, Wire
from cutblock.records.sweep import Serving, Sweep, SweepTiming, SweepVolumes
from cutblock.records.words import Closing, CutKind, Duty, Favour, Half, Layup, Severity


def read_plan_text(raw: bytes, name: str) -> Plan:
    """Return the plan that plan.json holds.

    Args:
        raw: The file.
        name: What to call it in a message.

    Raises:
        InputError: The file is cut short, edited beyond its shape, or of a later format.
    """
    try:
        file = msgspec.json.decode(raw, type=schema.PlanFile)
    except msgspec.ValidationError as error:
        text = str(error).replace("`", "").replace("$.", "")
        raise InputError(f"is not a plan this program reads: {text}.", name, "Make the plan again.") from error
    except (msgspec.DecodeError, RecursionError) as error:
        raise InputError(f"is damaged or cut short: {error}.", name, "Make the plan again.") from error
    try:
        return _plan(file)
    except ValueError as error:
        raise InputError(f"is not a plan this program reads: {error}.", name, "Make the plan again.") from error


def _plan(file: schema.PlanFile) -> Plan:
    return Plan(
        job=_job(file),
        settings=Settings(**_values(file.settings)),
        wire=Wire(**_values(file.wire)),
        machine=Machine(**_values(file.machine)),
        conditions=_conditions(file.conditions),
        panels=tuple(_panel(entry) for entry in file.panels),
        sweeps=tuple(_sweep(entry) for entry in file.sweeps),
        pieces=tuple(_piece(entry) for entry in file.pieces),
        volumes=_volumes(file),
        timings=tuple(_timing(entry) for entry in file.sweeps),
        deviations=tuple(deviation for entry in file.panels if (deviation := _deviation(entry)) is not None),
        bends=tuple(
            FaceBend(
                face=entry.name,
                area_mm2=entry.area_mm2,
                domed_mm2=entry.area_mm2 * entry.domed_percent / 100.0,
                noise_mm=entry.noise_mm,
            )
            for entry in file.faces
        ),
        blocks=tuple(_block(entry) for entry in file.blocks),
        n_blocks_bound=file.ledger.blocks_lower_bound,
        bound_proof=file.bound_proof,
        cost_bound=file.cost.foam_lower_bound,
        ledger=_ledger(file.ledger),
        hours=Hours(
            cutting_s=file.time.cutting_h * SECONDS_PER_HOUR,
            setup_s=file.time.setup_h * SECONDS_PER_HOUR,
            by_block_s=tuple((block, value * SECONDS_PER_HOUR) for block, value in file.time.blocks_h.items()),
            air_s=file.time.air_h * SECONDS_PER_HOUR,
            turn_s=file.time.turn_h * SECONDS_PER_HOUR,
            handling_s=file.time.handling_h * SECONDS_PER_HOUR,
        ),
        cost=Cost(
            currency=file.cost.currency,
            foam=file.cost.foam,
            machine=file.cost.machine,
            foam_bound=file.cost.foam_lower_bound,
        ),
        findings=tuple(
            Finding(severity=Severity(entry.severity), code=entry.code, subject=entry.subject, text=entry.text)
            for entry in file.findings
        ),
    )


def _values(entry: msgspec.Struct) -> dict[str, Any]:
    return {name: getattr(entry, name) for name in entry.__struct_fields__}


def _conditions(entry: schema.ConditionsEntry) -> Conditions:
    calibration = None if entry.calibration is None else Calibration(**_values(entry.calibration))
    return Conditions(**(_values(entry) | {"calibration": calibration}))


def _job(file: schema.PlanFile) -> Job:
    job = file.job
    return Job(
        id=job.id,
        title=job.title,
        units=job.units,
        revision=job.revision,
        path="",
        layup=Layup(job.layup),
        tolerance_mm=job.tolerance_mm,
        coat_mm=job.coat_mm,
        margin_mm=job.margin_mm,
        faces=(),
        grade=job.grade,
        density_kg_m3=file.conditions.density_kg_m3,
        stock=tuple(StockSpec(**_values(entry)) for entry in file.stock),
        least_offcut_mm=job.least_offcut_mm,
        machine=file.machine.name,
        wire=file.wire.name,
        power_w_m=file.conditions.power_w_m,
        kerf_mm=file.conditions.kerf_mm,
        wall_mm=job.wall_mm,
        favour=Favour(job.favour),
        squareness=job.squareness,
        unpaired=Duty(job.unpaired),
        thickness_mm=job.thickness_mm,
        closing=Closing(job.counter),
        currency=job.currency,
        hour_rate=job.hour_rate,
        takes_up_slack=job.slack == "backs",
        most_setups=job.setups,
        no_turn=tuple(job.no_turn),
        pins=tuple(Pin(block=pin.block, sweeps=tuple(pin.sweeps)) for pin in job.pins),
        calibration=file.conditions.calibration.name if file.conditions.calibration is not None else "",
        inputs=tuple((entry.path, entry.sha256) for entry in file.inputs),
    )


def _panel(entry: schema.PanelEntry) -> Panel:
    outline = tuple(np.array(ring) for ring in entry.outline_mm)
    return Panel(
        id=entry.id,
        face=entry.face,
        copy=entry.copy,
        row=entry.row,
        column=entry.column,
        length_mm=entry.length_mm,
        width_mm=entry.width_mm,
        origin_mm=np.array(entry.origin_mm),
        axes=np.array(entry.axes),
        outline=outline,
        is_rectangle=len(outline) == 1 and _is_rectangle(outline[0], entry.length_mm, entry.width_mm),
        heights_mm=np.zeros((0, 0)),
        samples_mm=np.zeros((0, 3)),
        normals=np.zeros((0, 3)),
        areas_mm2=np.array([entry.area_mm2]),
        neighbours=tuple(entry.neighbours),
        edges=tuple(
            PanelEdge(
                name=edge.name,
                start_mm=np.array(edge.start_mm),
                end_mm=np.array(edge.end_mm),
                normal=np.array(edge.normal),
                bow_mm=edge.bow_mm,
            )
            for edge in entry.edges
        ),
    )


def _deviation(entry: schema.PanelEntry) -> PanelDeviation | None:
    """Return the measures of a panel's map; the points are not in the file."""
    if entry.worst_mm is None or entry.worst_at_mm is None or entry.finished_p95_mm is None:
        return None
    return PanelDeviation(
        panel=entry.id,
        points_mm=np.zeros((0, 3)),
        deviation_mm=np.zeros(0),
        samples_per_m2=entry.samples_per_m2 or 0.0,
        worst_mm=entry.worst_mm,
        worst_at_mm=np.array(entry.worst_at_mm),
        p95_mm=entry.finished_p95_mm,
    )


def _is_rectangle(ring: Any, length_mm: float, width_mm: float) -> bool:  # noqa: ANN401 - an array from JSON
    corners = {(0.0, 0.0), (length_mm, 0.0), (length_mm, width_mm), (0.0, width_mm)}
    return {tuple(point) for point in ring.tolist()} == corners


def _serving(entry: schema.ServingEntry) -> Serving:
    return Serving(
        panel=entry.panel,
        half=Half(entry.half),
        rotation=np.array(entry.rotation),
        shift_mm=np.array(entry.shift_mm),
        max_mm=entry.max_mm,
        rms_mm=entry.rms_mm,
        p95_mm=entry.p95_mm,
        fit_max_mm=entry.fit_max_mm,
        fit_rms_mm=entry.fit_rms_mm,
        strip=entry.strip,
        n_strips=entry.n_strips,
        offset_mm=entry.offset_mm,
    )


def _sweep(entry: schema.SweepEntry) -> Sweep:
    return Sweep(
        id=entry.id,
        length_mm=entry.length_mm,
        width_mm=entry.width_mm,
        height_mm=entry.height_mm,
        near=np.array(entry.near_mm),
        far=np.array(entry.far_mm),
        wire_along=entry.wire_along,
        serving=tuple(_serving(serving) for serving in entry.serving),
        kerf_mm=entry.kerf_mm,
        fit_max_mm=entry.fit_max_mm,
        fit_rms_mm=entry.fit_rms_mm,
        skew_mm=entry.skew_mm,
        thickened_mm=entry.thickened_mm,
    )


def _volumes(file: schema.PlanFile) -> tuple[SweepVolumes, ...]:
    centres = {(piece.sweep, piece.half): piece.centre_mm for piece in file.pieces}
    return tuple(
        SweepVolumes(
            sweep=entry.id,
            lower_mm3=entry.lower_litres * MM3_PER_LITRE,
            upper_mm3=entry.upper_litres * MM3_PER_LITRE,
            kerf_mm3=entry.kerf_litres * MM3_PER_LITRE,
            face_mm2=entry.face_mm2,
            trimmed_mm3=entry.trimmed_litres * MM3_PER_LITRE,
            thickened_mm3=entry.thickened_litres * MM3_PER_LITRE,
            lower_centre_mm=centres.get((entry.id, "lower")),
            upper_centre_mm=centres.get((entry.id, "upper")),
        )
        for entry in file.sweeps
    )


def _timing(entry: schema.SweepEntry) -> SweepTiming:
    speed = entry.speed_mm_s
    return SweepTiming(
        sweep=entry.id,
        low_mm_s=speed.low,
        high_mm_s=speed.high,
        planned_mm_s=speed.planned,
        seconds=entry.seconds,
        step_seconds=np.array(entry.step_seconds),
        end_speed_ratio=entry.end_speed_ratio,
        twist_deg_per_m=entry.twist_deg_per_m,
    )


def _piece(entry: schema.PieceEntry) -> Piece:
    return Piece(
        id=entry.id,
        partner=entry.partner,
        sweep=entry.sweep,
        half=Half(entry.half),
        duty=Duty(entry.duty),
        code=entry.code,
        panel=entry.panel,
        block=entry.block,
        volume_mm3=entry.litres * MM3_PER_LITRE,
        mass_kg=entry.mass_kg,
        centre_mm=entry.centre_mm,
        filler=entry.filler,
        is_set=entry.set_by_hand,
    )


def _block(entry: schema.BlockEntry) -> Block:
    return Block(
        id=entry.id,
        length_mm=entry.length_mm,
        width_mm=entry.width_mm,
        height_mm=entry.height_mm,
        grade=entry.grade,
        skin_mm=entry.skin_mm,
        kerf_mm=entry.kerf_mm,
        billets=tuple(
            PlacedBillet(sweep=billet.sweep, at_mm=billet.at_mm, size_mm=billet.size_mm, turned=billet.turned)
            for billet in entry.billets
        ),
        cuts=tuple(
            Cut(
                order=cut.order,
                kind=CutKind(cut.kind),
                setup=cut.setup,
                part_at_mm=cut.part_at_mm,
                part_size_mm=cut.part_size_mm,
                axis=cut.axis,
                at_mm=cut.position_mm,
                sweep=cut.sweep,
                turn=cut.turn,
                frees=tuple(Freed(side=part.side, at_mm=part.at_mm, size_mm=part.size_mm) for part in cut.frees),
            )
            for cut in entry.cuts
        ),
        offcuts=tuple(Offcut(size_mm=offcut.size_mm, at_mm=offcut.at_mm) for offcut in entry.offcuts),
        from_offcut=entry.from_offcut,
        price=entry.price,
        bought_mm=entry.bought_mm,
        stock=entry.stock,
        density_kg_m3=entry.density_kg_m3,
        source=entry.source,
    )


def _ledger(entry: schema.LedgerEntry) -> Ledger:
    parts = {
        f"{name.removesuffix('_litres')}_mm3": getattr(entry, name) * MM3_PER_LITRE
        for name in entry.__struct_fields__
        if name.endswith("_litres")
    }
    return Ledger(**parts, n_blocks=entry.blocks, n_blocks_bound=entry.blocks_lower_bound)
