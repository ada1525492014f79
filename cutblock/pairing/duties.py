"""Pieces: the two halves of each sweep with their duties, ids and codes, and what must be said about them."""

import binascii
from collections.abc import Collection, Mapping, Sequence

from cutblock.pairing.fillers import fill_needs, filler_findings
from cutblock.pairing.locks import unknown_finding
from cutblock.records.duties import DutyLock
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding
from cutblock.records.sweep import Sweep
from cutblock.records.words import Duty, Half, Layup, Severity

_ENDINGS = {Half.LOWER: "L", Half.UPPER: "U"}


def piece_code(piece_id: str, revision: str) -> str:
    """Return what a piece's QR symbol holds: its id and revision with a checksum (CRC-16 of CCITT, start 0).

    Args:
        piece_id: Capitals, digits, `-` and `.` only: the alphanumeric mode of ISO/IEC 18004.
        revision: Likewise.
    """
    body = f"CB1:{piece_id}:{revision}"
    return f"{body}:{binascii.crc_hqx(body.encode('ascii'), 0):04X}"


def make_pieces(job: Job, sweeps: Sequence[Sweep], panels: Sequence[Panel] = ()) -> tuple[Piece, ...]:
    """Return the lower and upper half of every sweep; volume and mass are not known yet.

    An upper half that moulds no panel takes the duty that is set for it, else the job's for unpaired halves. A
    counter-mould and a cradle belong to the panel of the lower half, a filler and a surplus half to none. Where a
    panel's counter-mould has a sweep of its own, the upper half over its mould is the panel's cradle, and what that
    sweep leaves below is surplus. Where the job wants boxes, halves that hold some are fillers, the others surplus.

    Args:
        job: Duties, boxes and revision.
        sweeps: The sweeps that are cut.
        panels: The panels they serve; on the bed what is trimmed off round an outline holds no box.
    """
    closed = {serving.panel for sweep in sweeps for serving in sweep.serving if not serving.is_mould}
    wishes = {lock.piece: lock.duty for lock in job.locks if isinstance(lock, DutyLock)}
    pieces = tuple(_piece(job, sweep, half, closed, wishes) for sweep in sweeps for half in Half)
    if not job.fillers:
        return pieces
    trimmed = {panel.id for panel in panels if not panel.is_rectangle} if job.layup is Layup.BED else set()
    is_usable = [not trimmed & set(sweep.panels) for sweep in sweeps for _ in Half]
    return fill_needs(job, pieces, sweeps, is_usable)


def _duty_of(job: Job, sweep: Sweep, half: Half, closed: Collection[str]) -> tuple[Duty, str | None]:
    """Return what a half is for, and the panel it belongs to."""
    own = next((serving for serving in sweep.serving if serving.half is half), None)
    if own is not None:
        return Duty.MOULD if own.is_mould else Duty.COUNTER_MOULD, own.panel
    below = sweep.serving[0]
    if not below.is_mould:
        return Duty.SURPLUS, None
    if job.unpaired not in {Duty.COUNTER_MOULD, Duty.CRADLE}:
        return job.unpaired, None
    return Duty.CRADLE if below.panel in closed else job.unpaired, below.panel


def _piece(job: Job, sweep: Sweep, half: Half, closed: Collection[str], wishes: Mapping[str, Duty]) -> Piece:
    duty, panel = _duty_of(job, sweep, half, closed)
    piece_id = f"{sweep.id}-{_ENDINGS[half]}"
    other = Half.UPPER if half is Half.LOWER else Half.LOWER
    wish = wishes.get(piece_id)
    is_set = wish is not None and all(serving.half is not half for serving in sweep.serving)
    if is_set and wish is not None:
        below = sweep.serving[0].panel
        # A counter-mould that was asked for may have got a sweep of its own; then this half cradles the mould.
        duty = Duty.CRADLE if wish is Duty.COUNTER_MOULD and below in closed else wish
        panel = below if duty in {Duty.COUNTER_MOULD, Duty.CRADLE} else None
    return Piece(
        id=piece_id,
        partner=f"{sweep.id}-{_ENDINGS[other]}",
        sweep=sweep.id,
        half=half,
        duty=duty,
        code=piece_code(piece_id, job.revision),
        panel=panel,
        is_set=is_set,
    )


def duty_findings(job: Job, pieces: Sequence[Piece]) -> tuple[Finding, ...]:
    """Return what cannot have the duty that is set for it, what boxes come out of halves, and how many have no use."""
    by_id = {piece.id: piece for piece in pieces}
    findings = [
        unknown_finding(lock, "piece", lock.piece, list(by_id))
        for lock in job.locks
        if isinstance(lock, DutyLock) and lock.piece not in by_id
    ]
    findings += filler_findings(job, pieces)
    n_surplus = sum(piece.duty is Duty.SURPLUS for piece in pieces)
    if n_surplus:
        halves = "1 half has" if n_surplus == 1 else f"{n_surplus} halves have"
        text = f"{halves} no use yet. Give them a duty in the job, or choose panels that pair up."
        findings.append(Finding(severity=Severity.WARNING, code="surplus", subject=job.id, text=text))
    return tuple(findings)
