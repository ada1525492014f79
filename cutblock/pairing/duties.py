"""Pieces: the two halves of each sweep with their duties, ids and codes, and what must be said about them."""

import binascii
from collections.abc import Collection, Sequence

from cutblock.records.job import Job
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding
from cutblock.records.sweep import Sweep
from cutblock.records.words import Duty, Half, Severity

_ENDINGS = {Half.LOWER: "L", Half.UPPER: "U"}


def piece_code(piece_id: str, revision: str) -> str:
    """Return what a piece's QR symbol holds: its id and revision with a checksum (CRC-16 of CCITT, start 0).

    Args:
        piece_id: Capitals, digits, `-` and `.` only: the alphanumeric mode of ISO/IEC 18004.
        revision: Likewise.
    """
    body = f"CB1:{piece_id}:{revision}"
    return f"{body}:{binascii.crc_hqx(body.encode('ascii'), 0):04X}"


def make_pieces(job: Job, sweeps: Sequence[Sweep]) -> tuple[Piece, ...]:
    """Return the lower and upper half of every sweep; volume and mass are not known yet.

    An upper half that moulds no panel takes the job's duty for unpaired halves. A counter-mould and a cradle belong
    to the panel of the lower half, a filler and a surplus half to none. Where a panel's counter-mould has a sweep of
    its own, the upper half over its mould is the panel's cradle, and what that sweep leaves below is surplus.
    """
    closed = {serving.panel for sweep in sweeps for serving in sweep.serving if not serving.is_mould}
    return tuple(_piece(job, sweep, half, closed) for sweep in sweeps for half in Half)


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


def _piece(job: Job, sweep: Sweep, half: Half, closed: Collection[str]) -> Piece:
    duty, panel = _duty_of(job, sweep, half, closed)
    piece_id = f"{sweep.id}-{_ENDINGS[half]}"
    other = Half.UPPER if half is Half.LOWER else Half.LOWER
    return Piece(
        id=piece_id,
        partner=f"{sweep.id}-{_ENDINGS[other]}",
        sweep=sweep.id,
        half=half,
        duty=duty,
        code=piece_code(piece_id, job.revision),
        panel=panel,
    )


def duty_findings(job: Job, pieces: Sequence[Piece]) -> tuple[Finding, ...]:
    """Return how many halves have no use."""
    n_surplus = sum(piece.duty is Duty.SURPLUS for piece in pieces)
    if not n_surplus:
        return ()
    halves = "1 half has" if n_surplus == 1 else f"{n_surplus} halves have"
    text = f"{halves} no use yet. Give them a duty in the job, or choose panels that pair up."
    return (Finding(severity=Severity.WARNING, code="surplus", subject=job.id, text=text),)
