"""The kinds of error a user can meet; each says what is wrong, with what, and what to do."""

from typing import Any


class CutblockError(Exception):
    """Something the user can put right.

    Attributes:
        message: What is wrong, in the user's units.
        subject: The file and line, panel, piece or block it is about; may be empty.
        remedy: What to do about it; may be empty.
    """

    def __init__(self, message: str, subject: str = "", remedy: str = "") -> None:
        super().__init__(message, subject, remedy)
        self.message = message
        self.subject = subject
        self.remedy = remedy

    def __str__(self) -> str:
        head = f"{self.subject}: {self.message}" if self.subject else self.message
        sentence = head if head.endswith((".", "!", "?")) else f"{head}."
        return f"{sentence} {self.remedy}" if self.remedy else sentence

    def __reduce__(self) -> tuple[Any, ...]:
        return type(self), (self.message, self.subject, self.remedy)


class InputError(CutblockError, ValueError):
    """A file or value given by the user cannot be used."""


class GeometryError(CutblockError, ValueError):
    """A surface or solid is not what the step needs."""


class NotCuttable(CutblockError):  # noqa: N818 - the design names it so
    """A straight wire cannot make this within the limit named in the message."""


class StockError(CutblockError):
    """The blocks given cannot hold what is wanted."""


class CheckFailed(CutblockError):  # noqa: N818 - the design names it so
    """Our own re-reading of an output disagrees with the plan; nothing is written."""


class Cancelled(Exception):  # noqa: N818 - not an error
    """The user asked to stop."""
