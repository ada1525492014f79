"""A plan as the text of plan.json: the same plan gives the same bytes."""

from collections.abc import Iterable, Sequence
from dataclasses import fields
from typing import Any

import msgspec
import numpy as np
from numpy.typing import ArrayLike

import cutblock
from cutblock.base.errors import CutblockError
from cutblock.base.units import MM3_PER_LITRE, hours
from cutblock.flow import plan_schema as schema
from cutblock.flow import seals
from cutblock.ledger.shares import Account, accounts_of
from cutblock.records.account import Hours, Ledger
from cutblock.records.block import Block
from cutblock.records.deviation import PanelDeviation
from cutblock.records.panel import Panel, PanelEdge
from cutblock.records.plan import Plan
from cutblock.records.record import Record
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Serving, Sweep, SweepTiming, SweepVolumes

_LENGTH_DIGITS = 6
_LITRE_DIGITS = 9
_DIRECTION_DIGITS = 12


def plan_text(plan: Plan) -> str:
    """Return plan.json: one line an entry, so that two plans can be compared line by line.

    Raises:
        CutblockError: The plan is not complete.
    """
    values = msgspec.to_builtins(plan_file(plan))
    values[seals.KEY] = seals.seals_of(values)
    lines = []
    for key, value in values.items():
        if isinstance(value, list) and value:
            rows = ",\n".join(_compact(entry) for entry in value)
            lines.append(f'"{key}": [\n{rows}\n]')
        else:
            lines.append(f'"{key}": {_compact(value)}')
    return "{\n" + ",\n".join(lines) + "\n}\n"


def plan_file(plan: Plan) -> schema.PlanFile:
    """Return the plan in the shape of plan.json; raises like `plan_text`."""
    if plan.ledger is None or plan.hours is None or plan.cost is None:
        raise CutblockError("the plan is not complete", plan.job.id, "Make the whole plan first.")
    volumes = {entry.sweep: entry for entry in plan.volumes}
    timings = {entry.sweep: entry for entry in plan.timings}
    return schema.PlanFile(
        format=schema.FORMAT,
        program=f"cutblock {cutblock.__version__}",
        job=_job(plan),
        inputs=[schema.InputEntry(path=path, sha256=digest) for path, digest in plan.job.inputs],
        settings=schema.SettingsEntry(**_values(plan.settings)),
        conditions=_conditions(plan.conditions),
        wire=schema.WireEntry(**_values(plan.wire)),
        machine=schema.MachineEntry(**_values(plan.machine)),
        panels=_panels(plan),
        sweeps=[_sweep(sweep, volumes[sweep.id], timings[sweep.id]) for sweep in plan.sweeps],
        pieces=_pieces(plan),
        blocks=[_block(block) for block in plan.blocks],
        ledger=_ledger(plan.ledger),
        bound_proof=plan.bound_proof,
        time=_time(plan.hours),
        cost=schema.CostEntry(
            currency=plan.cost.currency,
            foam=plan.cost.foam,
            machine=plan.cost.machine,
            total=plan.cost.total,
            foam_lower_bound=plan.cost.foam_bound,
        ),
        findings=[
            schema.FindingEntry(severity=entry.severity.value, code=entry.code, subject=entry.subject, text=entry.text)
            for entry in plan.findings
        ],
        faces=[
            schema.FaceEntry(
                name=bend.face,
                area_mm2=_digits(bend.area_mm2, 3),
                domed_percent=_digits(bend.domed_percent, 3),
                noise_mm=None if bend.noise_mm is None else _digits(bend.noise_mm, 6),
            )
            for bend in plan.bends
        ],
        stock=[schema.StockEntry(**_values(row)) for row in plan.job.stock],
        ledger_parts=_accounts(plan),
    )


def _compact(value: object) -> str:
    return msgspec.json.encode(value).decode("utf-8")


def _values(record: Record) -> dict[str, Any]:
    values = {field.name: getattr(record, field.name) for field in fields(record)}  # type: ignore[arg-type]
    return {name: float(f"{value:.10g}") if isinstance(value, float) else value for name, value in values.items()}


def _conditions(conditions: Conditions) -> schema.ConditionsEntry:
    values, calibration = _values(conditions), conditions.calibration
    if calibration is not None:
        covariance = tuple(tuple(row) for row in calibration.covariance.tolist())
        values["calibration"] = schema.CalibrationEntry(**(_values(calibration) | {"covariance": covariance}))
    return schema.ConditionsEntry(**values)


def _digits(value: float, digits: int = _LENGTH_DIGITS) -> float:
    return round(float(value), digits) + 0.0  # + 0.0 turns -0.0 into 0.0


def _pairs(values: ArrayLike) -> list[schema.Pair]:
    rounded = np.round(np.asarray(values, dtype=np.float64), _LENGTH_DIGITS) + 0.0
    return [(first, second) for first, second in rounded.tolist()]


def _vector(values: Iterable[float], digits: int = _LENGTH_DIGITS) -> schema.Vector:
    x, y, z = (_digits(value, digits) for value in values)
    return x, y, z


def _axes(rows: Iterable[Iterable[float]]) -> tuple[schema.Vector, schema.Vector, schema.Vector]:
    x, y, z = (_vector(row, _DIRECTION_DIGITS) for row in rows)
    return x, y, z


def _litres(volume_mm3: float) -> float:
    return _digits(volume_mm3 / MM3_PER_LITRE, _LITRE_DIGITS)


def _job(plan: Plan) -> schema.JobEntry:
    job = plan.job
    return schema.JobEntry(
        id=job.id,
        title=job.title,
        revision=job.revision,
        units=job.units,
        layup=job.layup.value,
        tolerance_mm=job.tolerance_mm,
        coat_mm=job.coat_mm,
        margin_mm=job.margin_mm,
        wall_mm=job.wall_mm,
        grade=job.grade,
        favour=job.favour.value,
        squareness=job.squareness,
        unpaired=job.unpaired.value,
        thickness_mm=job.thickness_mm,
        counter=job.closing.value,
        least_offcut_mm=job.least_offcut_mm,
        currency=job.currency,
        hour_rate=job.hour_rate,
        slack="backs" if job.takes_up_slack else "scrap",
        setups=job.most_setups,
        no_turn=list(job.no_turn),
        pins=[schema.PinEntry(block=pin.block, sweeps=list(pin.sweeps)) for pin in job.pins],
    )


def _panels(plan: Plan) -> list[schema.PanelEntry]:
    served: dict[str, list[Serving]] = {panel.id: [] for panel in plan.panels}
    partner: dict[str, str] = {}
    for sweep in plan.sweeps:
        for serving in sweep.serving:
            if serving.is_mould:
                served[serving.panel].append(serving)
        if len(set(sweep.serves)) > 1:
            lower, upper = sweep.serves
            partner.setdefault(lower, upper)
            partner.setdefault(upper, lower)
    maps = {entry.panel: entry for entry in plan.deviations}
    return [_panel(panel, served[panel.id], partner.get(panel.id), maps.get(panel.id)) for panel in plan.panels]


def _panel(
    panel: Panel, servings: Sequence[Serving], partner: str | None, deviation: PanelDeviation | None
) -> schema.PanelEntry:
    def worst(name: str) -> float | None:
        return max((_digits(getattr(serving, name)) for serving in servings), default=None)

    return schema.PanelEntry(
        id=panel.id,
        face=panel.face,
        copy=panel.copy,
        row=panel.row,
        column=panel.column,
        length_mm=_digits(panel.length_mm),
        width_mm=_digits(panel.width_mm),
        fit_max_mm=worst("fit_max_mm"),
        fit_rms_mm=worst("fit_rms_mm"),
        finished_max_mm=worst("max_mm"),
        finished_rms_mm=worst("rms_mm"),
        paired_with=partner,
        area_mm2=_digits(panel.areas_mm2.sum(), 3),
        origin_mm=_vector(panel.origin_mm),
        axes=_axes(panel.axes),
        outline_mm=[_pairs(ring) for ring in panel.outline],
        neighbours=list(panel.neighbours),
        finished_p95_mm=None if deviation is None else _digits(deviation.p95_mm),
        worst_mm=None if deviation is None else _digits(deviation.worst_mm),
        worst_at_mm=None if deviation is None else _vector(deviation.worst_at_mm),
        samples_per_m2=None if deviation is None else _digits(deviation.samples_per_m2, 3),
        edges=[_edge(edge) for edge in panel.edges],
    )


def _edge(edge: PanelEdge) -> schema.EdgeEntry:
    return schema.EdgeEntry(
        name=edge.name,
        start_mm=_vector(edge.start_mm),
        end_mm=_vector(edge.end_mm),
        normal=_vector(edge.normal, _DIRECTION_DIGITS),
        bow_mm=_digits(edge.bow_mm),
    )


def _sweep(sweep: Sweep, volumes: SweepVolumes, timing: SweepTiming) -> schema.SweepEntry:
    return schema.SweepEntry(
        id=sweep.id,
        length_mm=_digits(sweep.length_mm),
        width_mm=_digits(sweep.width_mm),
        height_mm=_digits(sweep.height_mm),
        near_mm=_pairs(sweep.near),
        far_mm=_pairs(sweep.far),
        wire_along=sweep.wire_along,  # type: ignore[arg-type]
        serves=list(sweep.serves),
        lower_litres=_litres(volumes.lower_mm3),
        upper_litres=_litres(volumes.upper_mm3),
        kerf_litres=_litres(volumes.kerf_mm3),
        trimmed_litres=_litres(volumes.trimmed_mm3),
        thickened_mm=_digits(sweep.thickened_mm),
        thickened_litres=_litres(volumes.thickened_mm3),
        kerf_mm=(_digits(sweep.kerf_mm[0]), _digits(sweep.kerf_mm[1])),
        speed_mm_s=schema.SpeedEntry(
            low=_digits(timing.low_mm_s), high=_digits(timing.high_mm_s), planned=_digits(timing.planned_mm_s)
        ),
        seconds=_digits(timing.seconds),
        end_speed_ratio=_digits(timing.end_speed_ratio),
        twist_deg_per_m=_digits(timing.twist_deg_per_m),
        fit_max_mm=_digits(sweep.fit_max_mm),
        fit_rms_mm=_digits(sweep.fit_rms_mm),
        skew_mm=_digits(sweep.skew_mm),
        face_mm2=_digits(volumes.face_mm2, 3),
        step_seconds=(np.round(timing.step_seconds, _LENGTH_DIGITS) + 0.0).tolist(),
        serving=[_serving(serving) for serving in sweep.serving],
    )


def _serving(serving: Serving) -> schema.ServingEntry:
    return schema.ServingEntry(
        panel=serving.panel,
        half=serving.half.value,
        rotation=_axes(serving.rotation),
        shift_mm=_vector(serving.shift_mm),
        max_mm=_digits(serving.max_mm),
        rms_mm=_digits(serving.rms_mm),
        p95_mm=_digits(serving.p95_mm),
        fit_max_mm=_digits(serving.fit_max_mm),
        fit_rms_mm=_digits(serving.fit_rms_mm),
        strip=serving.strip,
        n_strips=serving.n_strips,
        offset_mm=_digits(serving.offset_mm),
    )


def _pieces(plan: Plan) -> list[schema.PieceEntry]:
    return [
        schema.PieceEntry(
            id=piece.id,
            partner=piece.partner,
            sweep=piece.sweep,
            half=piece.half.value,
            duty=piece.duty.value,
            panel=piece.panel,
            block=piece.block,
            litres=_litres(piece.volume_mm3),
            mass_kg=_digits(piece.mass_kg),
            code=piece.code,
            centre_mm=None if piece.centre_mm is None else _vector(piece.centre_mm),
            filler=piece.filler,
            set_by_hand=piece.is_set,
        )
        for piece in plan.pieces
    ]


def _block(block: Block) -> schema.BlockEntry:
    return schema.BlockEntry(
        id=block.id,
        length_mm=_digits(block.length_mm),
        width_mm=_digits(block.width_mm),
        height_mm=_digits(block.height_mm),
        grade=block.grade,
        skin_mm=_digits(block.skin_mm),
        kerf_mm=_digits(block.kerf_mm),
        price=block.price,
        from_offcut=block.from_offcut,
        billets=[
            schema.BilletEntry(
                sweep=billet.sweep,
                at_mm=_vector(billet.at_mm),
                size_mm=_vector(billet.size_mm),
                turned=billet.turned,
            )
            for billet in block.billets
        ],
        cuts=[
            schema.CutEntry(
                order=cut.order,
                kind=cut.kind.value,
                setup=cut.setup,
                part_at_mm=_vector(cut.part_at_mm),
                part_size_mm=_vector(cut.part_size_mm),
                axis=cut.axis,
                position_mm=_digits(cut.at_mm),
                sweep=cut.sweep,
                turn=cut.turn,
                frees=[
                    schema.FreedEntry(side=part.side, at_mm=_vector(part.at_mm), size_mm=_vector(part.size_mm))  # type: ignore[arg-type]
                    for part in cut.frees
                ],
            )
            for cut in block.cuts
        ],
        offcuts=[
            schema.OffcutEntry(size_mm=_vector(offcut.size_mm), at_mm=_vector(offcut.at_mm)) for offcut in block.offcuts
        ],
        bought_mm=None if block.bought_mm is None else _vector(block.bought_mm),
        stock=block.stock,
        density_kg_m3=block.density_kg_m3,
        source=block.source,
    )


def _time(spent: Hours) -> schema.TimeEntry:
    parts = {
        f"{part}_h": _digits(hours(getattr(spent, f"{part}_s")))
        for part in ("cutting", "air", "setup", "turn", "handling")
    }
    return schema.TimeEntry(
        **parts,
        total_h=_digits(sum(parts.values())),  # of the digits written, so that they add up
        blocks_h={block: _digits(hours(seconds)) for block, seconds in spent.by_block_s},
    )


def _accounts(plan: Plan) -> schema.AccountsEntry:
    accounts = accounts_of(
        plan.blocks, plan.volumes, plan.pieces, plan.conditions.density_kg_m3, is_coated=plan.job.coat_mm > 0.0
    )
    return schema.AccountsEntry(
        blocks=[_account(account) for account in accounts.blocks],
        grades=[_account(account) for account in accounts.grades],
        job=_account(accounts.job),
    )


def _account(account: Account) -> schema.AccountEntry:
    return schema.AccountEntry(
        name=account.name,
        grade=account.grade,
        blocks=account.n_blocks,
        bought=account.bought_ml,
        **account.parts_ml,
        scrap_clean=account.clean_scrap_ml,
        scrap_coated=account.coated_scrap_ml,
        coated_later=account.coated_later_ml,
        bought_kg=_digits(account.bought_kg),
        scrap_kg=_digits(account.scrap_kg),
    )


def _ledger(ledger: Ledger) -> schema.LedgerEntry:
    parts = {
        f"{field.name.removesuffix('_mm3')}_litres": _litres(getattr(ledger, field.name))
        for field in fields(ledger)
        if field.name.endswith("_mm3")
    }
    return schema.LedgerEntry(
        **parts,
        used_percent=_digits(ledger.used_percent),
        waste_percent=_digits(ledger.waste_percent),
        blocks=ledger.n_blocks,
        blocks_lower_bound=ledger.n_blocks_bound,
    )
