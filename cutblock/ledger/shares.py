"""The account in whole thousandths of a litre: block by block, grade by grade, and of the job, each an exact sum."""

from collections.abc import Sequence
from dataclasses import dataclass

from cutblock.base.units import mass_kg
from cutblock.ledger.account import block_accounts
from cutblock.records.account import LEDGER_PARTS, Ledger
from cutblock.records.block import Block
from cutblock.records.piece import Piece
from cutblock.records.record import Record
from cutblock.records.sweep import SweepVolumes
from cutblock.records.words import Duty

_MM3_PER_ML = 1000.0
_COATED = (Duty.MOULD, Duty.COUNTER_MOULD)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Account(Record):
    """One line of the account; volumes in whole thousandths of a litre.

    Scrap is clean or coated, because coated foam goes into another bin. Nothing here is cut off a piece that already
    has its coat: leftovers never get one, and a piece is trimmed to its outline when it comes off the machine, before
    it is coated. What the coat spoils is the moulds themselves, once they are used up.
    """

    name: str
    grade: str
    n_blocks: int
    bought_ml: int
    parts_ml: dict[str, int]  # by the names of LEDGER_PARTS; they sum to what was bought
    coated_later_ml: int  # moulds and counter-moulds that get a coat
    bought_kg: float
    scrap_kg: float

    @property
    def clean_scrap_ml(self) -> int:
        """Scrap that a maker of foam takes back."""
        return self.parts_ml["scrap"] - self.coated_scrap_ml

    @property
    def coated_scrap_ml(self) -> int:
        """Scrap cut off pieces that already had their coat: none, see the class."""
        return 0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Accounts(Record):
    """The account at its three sums."""

    blocks: tuple[Account, ...]
    grades: tuple[Account, ...]  # in the order of their first block
    job: Account


def accounts_of(
    blocks: Sequence[Block],
    volumes: Sequence[SweepVolumes],
    pieces: Sequence[Piece],
    density_kg_m3: float,
    *,
    is_coated: bool,
) -> Accounts:
    """Return the account of every block, of every grade and of the job.

    Args:
        blocks: Every block.
        volumes: Of every sweep.
        pieces: Every half, with its volume.
        density_kg_m3: Of blocks that do not have their own.
        is_coated: Whether cut faces get a coat.

    Raises:
        CheckFailed: See `account.account_block`.
    """
    coated = {block.id: 0.0 for block in blocks}
    for piece in pieces:
        if is_coated and piece.duty in _COATED and piece.block in coated:
            coated[piece.block] += piece.volume_mm3
    ledgers = block_accounts(blocks, volumes, pieces)
    rows = tuple(
        _of_block(block, ledgers[block.id], coated[block.id], block.density_kg_m3 or density_kg_m3) for block in blocks
    )
    grades = dict.fromkeys(row.grade for row in rows)
    by_grade = tuple(_sum(grade, grade, [row for row in rows if row.grade == grade]) for grade in grades)
    return Accounts(blocks=rows, grades=by_grade, job=_sum("job", "", by_grade))


def _of_block(block: Block, ledger: Ledger, coated_mm3: float, density_kg_m3: float) -> Account:
    parts = ledger.parts_ml
    return Account(
        name=block.id,
        grade=block.grade,
        n_blocks=1,
        bought_ml=ledger.bought_ml,
        parts_ml=parts,
        coated_later_ml=round(coated_mm3 / _MM3_PER_ML),
        bought_kg=mass_kg(ledger.bought_ml * _MM3_PER_ML, density_kg_m3),
        scrap_kg=mass_kg(parts["scrap"] * _MM3_PER_ML, density_kg_m3),
    )


def _sum(name: str, grade: str, rows: Sequence[Account]) -> Account:
    return Account(
        name=name,
        grade=grade,
        n_blocks=sum(row.n_blocks for row in rows),
        bought_ml=sum(row.bought_ml for row in rows),
        parts_ml={part: sum(row.parts_ml[part] for row in rows) for part in LEDGER_PARTS},
        coated_later_ml=sum(row.coated_later_ml for row in rows),
        bought_kg=sum(row.bought_kg for row in rows),
        scrap_kg=sum(row.scrap_kg for row in rows),
    )
