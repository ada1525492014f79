"""The worker seen from the window: a kept-warm process of its own that runs one request at a time.

A process and not a thread, because the libraries hold the interpreter lock for seconds and only a process can be
stopped by force. Sending and receiving run in a thread beside the caller's, so that no large plan is pickled or
unpickled in the caller's thread.
"""

import contextlib
import gc
import multiprocessing
import pickle
import queue
import sys
import threading
import time
from collections.abc import Sequence

from cutblock.worker.child import WARM_UP, Request, serve
from cutblock.worker.events import Cancelled, Event, Failure, Part, Progress, failure_of

GRACE_S = 0.6  # for a request to notice that it shall stop, before its process is killed
_JOIN_S = 5.0
_LARGE_BYTES = 100_000
_SWITCH_S = 0.0005


class Worker:
    """Runs one long request at a time in a process of its own; call every method from one thread."""

    def __init__(self, warm_up: Sequence[str] = WARM_UP, grace_s: float = GRACE_S) -> None:
        self._warm_up = tuple(warm_up)
        self._grace_s = grace_s
        self._child: _Child | None = None
        self._tickets = 0
        self._ticket: int | None = None  # of the request under way
        self._deadline_s: float | None = None  # when a cancelled request is stopped by force

    @property
    def is_busy(self) -> bool:
        """Whether a request is under way."""
        return self._ticket is not None

    @property
    def pid(self) -> int | None:
        """The process id, None while no process runs."""
        return self._child.pid if self._child is not None else None

    def start(self) -> None:
        """Start the process, which then imports what it will need; does nothing when it runs already."""
        if self._child is None or not self._child.is_alive:
            self._drop_child()
            self._child = _Child(self._warm_up)

    def submit(self, request: Request) -> int:
        """Begin a request and return its ticket.

        Raises:
            RuntimeError: Another request is under way.
        """
        if self._ticket is not None:
            raise RuntimeError("the worker is busy with another request")
        self.start()
        assert self._child is not None
        self._tickets += 1
        self._ticket = self._tickets
        self._child.outbox.put((self._ticket, request))
        return self._ticket

    def poll(self) -> list[Event]:
        """Return what has happened since the last call, oldest first; never waits."""
        events: list[Event] = []
        while self._ticket is not None and self._child is not None:
            try:
                event = self._child.inbox.get_nowait()
            except queue.Empty:
                break
            events.append(self._settled(event))
        if self._ticket is not None and self._deadline_s is not None and time.monotonic() >= self._deadline_s:
            events.append(Cancelled(ticket=self._ticket))
            self._finish()
            self._restart()
        return events

    def cancel(self) -> None:
        """Ask the request under way to stop; `poll` kills its process when it does not react in time."""
        if self._ticket is None or self._child is None or self._deadline_s is not None:
            return
        self._deadline_s = time.monotonic() + self._grace_s
        self._child.order_stop(self._ticket)

    def close(self) -> None:
        """Stop the request under way, gently first, and end the process."""
        self.cancel()
        while self._ticket is not None and self._deadline_s is not None and time.monotonic() < self._deadline_s:
            self.poll()
            time.sleep(0.01)
        self._finish()
        self._drop_child()

    def _settled(self, event: Event | None) -> Event:
        """Return the event to tell, None standing for the end of the process; finish the request at its last event."""
        assert self._ticket is not None
        if isinstance(event, Progress | Part):
            return event
        ticket, was_cancelled = self._ticket, self._deadline_s is not None
        self._finish()
        if event is not None:
            return event
        code = self._child.exit_code if self._child is not None else None
        self._restart()
        if was_cancelled:
            return Cancelled(ticket=ticket)
        return Failure(
            ticket=ticket,
            message="The background process stopped before it was done.",
            remedy="A new one was started: try again. If it happens again, close other programs to free memory.",
            is_bug=True,
            traceback=f"exit code {code}",
        )

    def _finish(self) -> None:
        self._ticket = None
        self._deadline_s = None

    def _restart(self) -> None:
        self._drop_child()
        self.start()

    def _drop_child(self) -> None:
        if self._child is not None:
            self._child.end()
        self._child = None


class _Child:
    """One spawned process with the thread that talks to it; `inbox` ends with None when the process has ended."""

    def __init__(self, warm_up: Sequence[str]) -> None:
        context = multiprocessing.get_context("spawn")
        self._talk, its_talk = context.Pipe()
        # A pipe and not an Event: a process killed while it holds an Event's lock would lock us out for ever.
        its_orders, self._orders = context.Pipe(duplex=False)
        self._process = context.Process(
            target=serve, args=(its_talk, its_orders, warm_up), name="cutblock worker", daemon=True
        )
        self._process.start()
        its_talk.close()  # the only other ends are the child's, so that its end is noticed
        its_orders.close()
        self.outbox: queue.SimpleQueue[tuple[int, Request] | None] = queue.SimpleQueue()
        self.inbox: queue.SimpleQueue[Event | None] = queue.SimpleQueue()
        self._thread = threading.Thread(target=self._converse, name="cutblock worker talk", daemon=True)
        self._thread.start()

    @property
    def pid(self) -> int | None:
        return self._process.pid

    @property
    def is_alive(self) -> bool:
        return self._process.is_alive()

    @property
    def exit_code(self) -> int | None:
        self._process.join(_JOIN_S)
        return self._process.exitcode

    def order_stop(self, ticket: int) -> None:
        with contextlib.suppress(OSError):  # it has just ended: its end is told by the inbox
            self._orders.send(ticket)

    def end(self) -> None:
        self._process.kill()
        self._process.join(_JOIN_S)
        self.outbox.put(None)
        self._thread.join(_JOIN_S)
        self._talk.close()
        self._orders.close()
        self._process.close()

    def _converse(self) -> None:
        while (message := self.outbox.get()) is not None:
            try:
                ticket, request = message
                pickled = pickle.dumps(request)  # before anything is sent: it may fail
                self._talk.send(ticket)
                self._talk.send_bytes(pickled)
                while isinstance(event := self._receive(), Progress | Part):
                    self.inbox.put(event)
                self.inbox.put(event)
            except (EOFError, OSError):
                self.inbox.put(None)
            except Exception as error:  # noqa: BLE001 - what cannot be pickled is a fault of the program to be told
                self.inbox.put(failure_of(error, message[0]))

    def _receive(self) -> Event:
        """Wait for the next event and unpickle it.

        The cyclic garbage collector rests meanwhile and then forgets what there is: it would stop every thread, the
        window's too, for as long as it takes to look at each of the many objects of a plan. And the interpreter lock
        is handed over soon, because the window asks for it many times in each of its paintings.
        """
        pickled = self._talk.recv_bytes()
        usual_s = sys.getswitchinterval()
        gc.disable()
        sys.setswitchinterval(_SWITCH_S)
        try:
            event: Event = pickle.loads(pickled)
            if len(pickled) > _LARGE_BYTES:
                gc.freeze()
        finally:
            sys.setswitchinterval(usual_s)
            gc.enable()
        return event
