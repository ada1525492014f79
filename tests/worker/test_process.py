import threading
import time

import pytest
from kit.stub_requests import Break, Churn, Count, Deaf, Die, Give, Loaded, Missing, Refuse, ReturnLock

from cutblock.worker.events import Cancelled, Failure, Progress, Result
from cutblock.worker.process import Worker


@pytest.fixture
def worker():
    made = Worker(warm_up=())
    made.start()
    yield made
    made.close()


def drain(worker, seconds=20.0, until=lambda events: False):
    """Poll until the request is over, or `until` says so, and return all events."""
    events = []
    end = time.monotonic() + seconds
    while worker.is_busy and not until(events):
        assert time.monotonic() < end, f"still busy after {seconds} s: {events}"
        events += worker.poll()
        time.sleep(0.005)
    return events


def test_a_request_tells_its_progress_and_then_its_result(worker):
    ticket = worker.submit(Count(n=3, gap_s=0.06))

    events = drain(worker)

    assert events[:-1] == [Progress(ticket=ticket, fraction=i / 3, text=f"step {i + 1}") for i in range(3)]
    assert events[-1] == Result(ticket=ticket, value=3)


def test_the_same_process_answers_one_request_after_another(worker):
    pid = worker.pid

    tickets = []
    for value in ("one", "two", "three"):
        tickets.append(worker.submit(Give(value)))
        assert drain(worker) == [Result(ticket=tickets[-1], value=value)]

    assert worker.pid == pid
    assert len(set(tickets)) == 3


def test_two_requests_at_once_are_refused(worker):
    worker.submit(Count(gap_s=0.05))

    with pytest.raises(RuntimeError, match="busy"):
        worker.submit(Give(1))


def test_no_more_than_twenty_progress_messages_a_second_come(worker):
    start = time.monotonic()
    worker.submit(Churn(seconds=0.6))

    events = drain(worker)

    assert len(events) - 1 <= 20 * (time.monotonic() - start) + 1
    assert len(events) > 4


def test_a_cancelled_request_that_reports_stops_gently_and_the_process_stays(worker):
    pid = worker.pid
    ticket = worker.submit(Churn())
    drain(worker, until=lambda events: events)

    start = time.monotonic()
    worker.cancel()
    events = drain(worker)

    assert events[-1] == Cancelled(ticket=ticket)
    assert time.monotonic() - start < 0.5
    assert worker.pid == pid


def test_a_cancelled_request_that_never_reports_is_killed_within_a_second(worker):
    worker.submit(Give("the process is up"))
    drain(worker)
    pid = worker.pid
    ticket = worker.submit(Deaf())

    start = time.monotonic()
    worker.cancel()
    events = drain(worker)

    assert events == [Cancelled(ticket=ticket)]
    assert time.monotonic() - start < 1.0
    assert worker.pid != pid
    worker.submit(Give("again"))
    assert drain(worker)[-1].value == "again"


def test_a_late_cancel_does_not_touch_the_next_request(worker):
    first = worker.submit(Give("done"))
    time.sleep(0.5)  # the result waits to be polled
    worker.cancel()
    assert drain(worker) == [Result(ticket=first, value="done")]

    worker.submit(Count(n=2))

    assert isinstance(drain(worker)[-1], Result)


def test_what_the_user_can_put_right_comes_without_a_traceback(worker):
    ticket = worker.submit(Refuse())

    assert drain(worker) == [
        Failure(
            ticket=ticket,
            message="twist of 9 degrees per metre, 5 allowed",
            subject="panel S-A03",
            remedy="Divide the face more finely.",
        )
    ]


def test_a_missing_file_is_named_and_is_no_bug(worker):
    worker.submit(Missing())

    (failure,) = drain(worker)

    assert failure.subject == "/nowhere/at all/job.toml"
    assert not failure.is_bug
    assert failure.remedy


def test_a_fault_in_the_process_carries_its_traceback(worker):
    worker.submit(Break())

    (failure,) = drain(worker)

    assert failure.is_bug
    assert "KeyError" in failure.message
    assert "stub_requests.py" in failure.traceback


def test_a_process_that_dies_is_told_and_replaced(worker):
    ticket = worker.submit(Die())

    (failure,) = drain(worker)

    assert (failure.ticket, failure.is_bug, failure.traceback) == (ticket, True, "exit code 7")
    worker.submit(Give("alive"))
    assert drain(worker)[-1].value == "alive"


def test_a_process_that_dies_while_idle_is_replaced_at_the_next_request(worker):
    worker.submit(Give("up"))
    drain(worker)
    worker._child._process.kill()
    worker._child._process.join()

    worker.submit(Give("alive"))

    assert drain(worker)[-1].value == "alive"


def test_a_request_that_cannot_be_pickled_is_told(worker):
    worker.submit(Give(threading.Lock()))

    (failure,) = drain(worker)

    assert failure.is_bug
    assert "pickle" in failure.message


def test_a_request_that_the_process_cannot_read_is_told_with_its_traceback(worker, monkeypatch):
    monkeypatch.setattr("kit.stub_requests.OnlyHere", only_here := type("OnlyHere", (), {}), raising=False)
    only_here.__module__, only_here.__qualname__ = "kit.stub_requests", "OnlyHere"
    pid = worker.pid
    worker.submit(only_here())

    (failure,) = drain(worker)

    assert failure.is_bug
    assert "OnlyHere" in failure.message
    assert worker.pid == pid


def test_a_result_that_cannot_be_pickled_is_told(worker):
    worker.submit(ReturnLock())

    (failure,) = drain(worker)

    assert failure.is_bug
    assert "pickle" in failure.message


def test_closing_leaves_no_thread_and_no_process():
    before = set(threading.enumerate())
    worker = Worker(warm_up=())
    worker.submit(Deaf())
    process = worker._child._process

    start = time.monotonic()
    worker.close()

    assert time.monotonic() - start < 2.0
    assert set(threading.enumerate()) == before
    with pytest.raises(ValueError, match="closed"):
        process.is_alive()


def test_polling_an_idle_or_unstarted_worker_gives_nothing():
    worker = Worker(warm_up=())

    assert worker.poll() == []
    worker.cancel()
    worker.close()


def test_a_process_that_cannot_even_warm_up_is_told_and_replaced_at_the_next_request():
    worker = Worker(warm_up=("no_such_module_at_all",))
    worker.start()
    worker._child._process.join(10.0)
    assert not worker._child.is_alive

    worker.submit(Give(1))

    assert drain(worker)[-1].value == 1
    worker.close()


def test_the_process_warms_up_by_itself_until_a_request_comes():
    worker = Worker(warm_up=("fractions", "kit.stub_requests"))
    worker.start()
    time.sleep(1.0)
    worker.submit(Loaded(("fractions", "kit.stub_requests", "ftplib")))

    assert drain(worker)[-1].value == ["fractions", "kit.stub_requests"]
    worker.close()
