"""What runs inside the worker process: one request after another, each with progress and cancel."""

import contextlib
import importlib
import os
import pickle
import signal
import time
from collections.abc import Generator, Sequence
from multiprocessing.connection import Connection
from typing import Protocol

from cutblock.base.errors import Cancelled as Stopped
from cutblock.base.progress import Progress as Report
from cutblock.worker.events import Cancelled, Event, Part, Progress, Result, failure_of

# Imported before the first request, so that it starts at once; together they take some seconds.
WARM_UP = (
    "numpy",
    "scipy.optimize",
    "scipy.sparse.linalg",
    "scipy.interpolate",
    "scipy.special",
    "shapely",
    "manifold3d",
    "trimesh",
    "cutblock.flow.jobfile",
    "cutblock.flow.chain",
)
LEAST_GAP_S = 0.05  # between two progress messages
NICENESS = 5  # the window keeps its share of a busy computer


class Request(Protocol):
    """Something the worker can do: a picklable record."""

    def run(self, progress: Report) -> object:
        """Do it and return a picklable value; `progress` raises `Cancelled` when the user wants to stop.

        A generator's values are told one by one as soon as they are there; the value it returns comes last.
        """


def serve(talk: Connection, orders: Connection, warm_up: Sequence[str]) -> None:
    """Answer requests until the other side hangs up.

    Args:
        talk: Gives a ticket and then a pickled request, takes events.
        orders: Gives the ticket of the request to stop.
        warm_up: Modules to import before the first request comes.
    """
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # Ctrl+C in a terminal reaches us too; the window decides
    if hasattr(os, "nice"):
        os.nice(NICENESS)
    for name in warm_up:
        if talk.poll():
            break  # somebody waits already: the request imports what it needs
        importlib.import_module(name)
    with contextlib.suppress(EOFError, OSError):
        while True:
            ticket, pickled = talk.recv(), talk.recv_bytes()
            _send_last(talk, _answer(ticket, pickled, talk, orders))


def _answer(ticket: int, pickled: bytes, talk: Connection, orders: Connection) -> Event:
    last_s = -LEAST_GAP_S

    def report(fraction: float, text: str) -> None:
        nonlocal last_s
        if _is_told_to_stop(ticket, orders):
            raise Stopped
        now_s = time.monotonic()
        if now_s - last_s >= LEAST_GAP_S:
            last_s = now_s
            talk.send(Progress(ticket=ticket, fraction=min(max(fraction, 0.0), 1.0), text=text))

    try:
        request: Request = pickle.loads(pickled)
        value = request.run(report)
        if isinstance(value, Generator):
            value = _tell_parts(value, ticket, talk)
        return Result(ticket=ticket, value=value)
    except Stopped:
        return Cancelled(ticket=ticket)
    except BrokenPipeError:
        raise  # nobody listens any more
    except Exception as error:  # noqa: BLE001 - the one place where a fault of a request is caught and told
        return failure_of(error, ticket)


def _tell_parts(parts: Generator[object, None, object], ticket: int, talk: Connection) -> object:
    """Send what the generator yields and return what it returns."""
    while True:
        try:
            value = next(parts)
        except StopIteration as end:
            return end.value
        talk.send(Part(ticket=ticket, value=value))


def _send_last(talk: Connection, event: Event) -> None:
    """Send the last event of a request; a value that cannot be pickled becomes a failure (nothing was sent of it)."""
    try:
        talk.send(event)
    except OSError:
        raise  # nobody listens any more
    except Exception as error:  # noqa: BLE001 - a pickler raises almost anything
        talk.send(failure_of(error, event.ticket))


def _is_told_to_stop(ticket: int, orders: Connection) -> bool:
    """Read what is waiting; an order for an earlier request that was already done is dropped."""
    is_told = False
    while orders.poll():
        is_told |= orders.recv() == ticket
    return is_told
