"""The plans shown one after the other, for Undo."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from PySide6.QtGui import QUndoCommand

if TYPE_CHECKING:
    from cutblock.worker.requests import ShownPlan


@dataclass(slots=True)
class Entry:
    """A plan shown now or once; its pictures come after it."""

    shown: "ShownPlan | None" = None
    job_path: str | None = None
    is_saved: bool = True


class ShowCommand(QUndoCommand):
    """Show another plan."""

    def __init__(self, put: Callable[[Entry], None], before: Entry, after: Entry) -> None:
        super().__init__("change of plan")
        self._put, self._before, self._after = put, before, after

    def redo(self) -> None:
        """Show the later plan."""
        self._put(self._after)

    def undo(self) -> None:
        """Show the plan before."""
        self._put(self._before)
