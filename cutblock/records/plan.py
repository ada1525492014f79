"""The plan: everything known about a job after each step; replaced, never edited."""

from dataclasses import dataclass

from cutblock.records.account import Cost, Hours, Ledger
from cutblock.records.block import Block
from cutblock.records.deviation import FaceBend, PanelDeviation
from cutblock.records.form import Face
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.record import Record
from cutblock.records.shop import Conditions, Machine, Wire
from cutblock.records.sweep import Sweep, SweepTiming, SweepVolumes
from cutblock.records.words import Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding(Record):
    """Something a step could do, but that someone must look at."""

    severity: Severity
    code: str  # short-words-with-hyphens, stable
    subject: str  # panel, piece, block or file
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings(Record):
    """How hard to search; part of a plan, so that it can be made again."""

    seed: int = 0
    seconds: float | None = None  # None: a fixed number of packing moves
    moves: int | None = None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Plan(Record):
    """A job and what has been worked out so far."""

    job: Job
    settings: Settings
    wire: Wire
    machine: Machine
    conditions: Conditions
    faces: tuple[Face, ...] = ()
    panels: tuple[Panel, ...] = ()
    sweeps: tuple[Sweep, ...] = ()
    pieces: tuple[Piece, ...] = ()
    volumes: tuple[SweepVolumes, ...] = ()
    timings: tuple[SweepTiming, ...] = ()
    deviations: tuple[PanelDeviation, ...] = ()  # of the finished faces, one for each panel that has a mould
    bends: tuple[FaceBend, ...] = ()
    blocks: tuple[Block, ...] = ()
    n_blocks_bound: int = 0
    bound_proof: str = ""  # what proved the bound
    cost_bound: float | None = None  # money; no packing can cost less
    ledger: Ledger | None = None
    hours: Hours | None = None
    cost: Cost | None = None
    findings: tuple[Finding, ...] = ()
