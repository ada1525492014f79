"""What the worker tells about a request; every event names its request by the ticket `submit` gave."""

import traceback
from dataclasses import dataclass

from cutblock.base.errors import CutblockError


@dataclass(frozen=True, slots=True, kw_only=True)
class Progress:
    """How far the request is."""

    ticket: int
    fraction: float  # in [0, 1]
    text: str  # what is being done


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """Something the request has ready before it is done; more follows."""

    ticket: int
    value: object


@dataclass(frozen=True, slots=True, kw_only=True)
class Result:
    """The request is done; nothing more follows."""

    ticket: int
    value: object


@dataclass(frozen=True, slots=True, kw_only=True)
class Failure:
    """The request could not be done; nothing more follows."""

    ticket: int
    message: str  # what is wrong
    subject: str = ""  # file, panel, piece or block it is about
    remedy: str = ""  # what to do
    is_bug: bool = False
    traceback: str = ""  # of a bug


@dataclass(frozen=True, slots=True, kw_only=True)
class Cancelled:
    """The request was stopped as asked; nothing more follows."""

    ticket: int


Event = Progress | Part | Result | Failure | Cancelled


def failure_of(error: BaseException, ticket: int) -> Failure:
    """Return what to tell about `error`: what the user can put right is told plainly, the rest is a bug."""
    if isinstance(error, CutblockError):
        return Failure(ticket=ticket, message=error.message, subject=error.subject, remedy=error.remedy)
    if isinstance(error, MemoryError):
        return Failure(
            ticket=ticket,
            message="The computer has not enough free memory for this job.",
            remedy="Close other programs, or divide the job into smaller ones.",
        )
    if isinstance(error, OSError) and error.filename is not None:
        return Failure(
            ticket=ticket,
            message=error.strerror or "The file or folder cannot be used.",
            subject=str(error.filename),
            remedy="Check that it exists, that it is not open elsewhere, and that you may write there.",
        )
    return Failure(
        ticket=ticket,
        message=f"{type(error).__name__}: {error}",
        remedy="Nothing you saved is lost. Please report it with the details.",
        is_bug=True,
        traceback="".join(traceback.format_exception(error)),
    )
