"""What a job sets about halves by hand: locks of duties and pairs, and the boxes it wants as fillers."""

import re
from collections.abc import Sequence

from cutblock.flow.job_schema import FillerTable, SetTable
from cutblock.flow.job_stock import PlaceOf, Refuse
from cutblock.flow.toml_lines import Path as KeyPath
from cutblock.records.duties import DutyLock, Filler, Lock, PairLock, SingleLock
from cutblock.records.words import Duty

_PIECE = re.compile(r"(?P<panel>.+?)(?P<counter>\.C)?(?:\.\d+)?-(?P<half>[LU])")


def read_fillers(tables: Sequence[FillerTable], scale: float, place_of: PlaceOf, refuse: Refuse) -> tuple[Filler, ...]:
    """Return the boxes wanted as fillers, in the order of the job.

    Args:
        tables: The job's `[[filler]]`.
        scale: One of the job's unit in mm.
        place_of: File and line of a key.
        refuse: Refuses the job at a key.

    Raises:
        InputError: A name is taken.
    """
    fillers: list[Filler] = []
    for index, table in enumerate(tables):
        path: KeyPath = ("filler", index)
        if any(filler.name == table.name for filler in fillers):
            refuse((*path, "name"), f'"{table.name}" is taken', "Give every filler its own name.")
        size = (table.length * scale, table.width * scale, table.height * scale)
        fillers.append(Filler(name=table.name, size_mm=size, count=table.count, place=place_of(path)))
    return tuple(fillers)


def read_locks(
    tables: Sequence[SetTable], job_id: str, thickness_mm: float, place_of: PlaceOf, refuse: Refuse
) -> tuple[Lock, ...]:
    """Return what is set by hand, in the order of the job.

    Whether panels and pieces of these names exist is only known once the faces are divided; see `pairing.locks`.

    Args:
        tables: The job's `[[duties.set]]`.
        job_id: Begins every piece id.
        thickness_mm: Of the concrete; a counter-mould needs it.
        place_of: File and line of a key.
        refuse: Refuses the job at a key.

    Raises:
        InputError: A table sets nothing or several things, a name cannot be a piece's, a mould is to be something
            else, or two tables contradict each other.
    """
    reader = _Locks(job_id, thickness_mm, place_of, refuse)
    for index, table in enumerate(tables):
        reader.read(("duties", "set", index), table)
    return tuple(reader.locks)


class _Locks:
    """The locks read so far, and which panels they bind."""

    def __init__(self, job_id: str, thickness_mm: float, place_of: PlaceOf, refuse: Refuse) -> None:
        self.locks: list[Lock] = []
        self._job_id, self._thickness_mm = job_id, thickness_mm
        self._place_of, self._refuse = place_of, refuse
        self._paired: dict[str, str] = {}  # panel: where it was set
        self._alone: dict[str, str] = {}
        self._pieces: dict[str, str] = {}

    def read(self, path: KeyPath, table: SetTable) -> None:
        """Take one table."""
        given = [name for name in ("piece", "pair", "single") if getattr(table, name) is not None]
        if len(given) != 1:
            what = "sets nothing" if not given else f"sets several things ({', '.join(given)})"
            self._refuse(path, what, "Give piece with duty, or pair, or single, each in a table of its own.")
        if (table.duty is not None) != (table.piece is not None):
            self._refuse(path, "piece and duty go together", "Give both, or neither.")
        place = self._place_of(path)
        if table.piece is not None and table.duty is not None:
            self._piece(path, table.piece, Duty(table.duty), place)
        elif table.pair is not None:
            self._pair(path, table.pair, place)
        else:
            self._single(path, table.single or [], place)

    def _piece(self, path: KeyPath, piece: str, duty: Duty, place: str) -> None:
        start = f"{self._job_id}-"
        found = _PIECE.fullmatch(piece.removeprefix(start))
        if not piece.startswith(start) or found is None:
            self._refuse(
                (*path, "piece"),
                f'no piece of this job can be called "{piece}"',
                f"Piece ids read {start}PANEL-U, as in pieces.csv.",
            )
        is_counter = found["counter"] is not None
        if (found["half"] == "L") != is_counter:
            what = "cut by a sweep of its own to close a mould" if is_counter else "the mould of its panel"
            self._refuse((*path, "piece"), f'"{piece}" is {what}', "Only what is left over can be given a duty.")
        if piece in self._pieces:
            self._refuse((*path, "piece"), f'"{piece}" is set at {self._pieces[piece]} too', "Take one of them out.")
        if duty is Duty.COUNTER_MOULD and self._thickness_mm == 0.0:
            self._refuse((*path, "duty"), "a counter-mould needs the concrete's thickness", "Give duties.thickness.")
        if not is_counter and found["panel"] in self._paired:
            self._refuse(
                (*path, "piece"),
                f'the pair at {self._paired[found["panel"]]} needs both halves of "{found["panel"]}"',
                "Take one of them out.",
            )
        self._pieces[piece] = place
        if not is_counter:
            self._alone.setdefault(found["panel"], place)
        self.locks.append(DutyLock(piece=piece, duty=duty, place=place))

    def _pair(self, path: KeyPath, pair: tuple[str, str], place: str) -> None:
        if pair[0] == pair[1]:
            self._refuse((*path, "pair"), f'"{pair[0]}" is paired with itself', "Name two panels.")
        for panel in pair:
            if panel in self._paired:
                self._refuse(
                    (*path, "pair"), f'"{panel}" is paired at {self._paired[panel]} too', "Take one of them out."
                )
            if panel in self._alone:
                self._refuse(
                    (*path, "pair"),
                    f'"{panel}" is kept by itself at {self._alone[panel]}',
                    "Take one of them out.",
                )
        self._paired.update(dict.fromkeys(pair, place))
        self.locks.append(PairLock(panels=pair, place=place))

    def _single(self, path: KeyPath, panels: list[str], place: str) -> None:
        for panel in panels:
            if panel in self._paired:
                self._refuse(
                    (*path, "single"), f'"{panel}" is paired at {self._paired[panel]}', "Take one of them out."
                )
            self._alone.setdefault(panel, place)
        self.locks.append(SingleLock(panels=tuple(panels), place=place))
